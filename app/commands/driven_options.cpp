#include "app/commands/driven_options.h"

#include "base/number_text.h"

namespace coilassay {

OptionGroup current_options() {
  using enum Range;
  return {.title = "Current",
          .options = {{.name = "--current",
                       .kind = ValueKind::text,
                       .value_name = "COL",
                       .help = "column with the current, or with the voltage of the shunt or probe that shows it",
                       .example = "CH2"},
                      {.name = "--current-low",
                       .kind = ValueKind::text,
                       .value_name = "COL",
                       .help = "column that is subtracted from it first, for a shunt whose low end is not at earth",
                       .example = "CH3"},
                      {.name = "--shunt",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "sense resistor; the current column is then in volts",
                       .example = "0.1ohm±1%",
                       .unit = Unit::ohm,
                       .range = positive},
                      {.name = "--shunt-inductance",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "of the sense resistor",
                       .example = "2nH±1nH",
                       .unit = Unit::henry,
                       .range = not_negative},
                      {.name = "--current-gain",
                       .kind = ValueKind::text,
                       .value_name = "VALUE",
                       .help = "factor the file has not applied yet: in A/V for a probe in volts, a plain number for a "
                               "column in A or beside a shunt",
                       .example = "10A/V±2%"},
                      {.name = "--skew",
                       .kind = ValueKind::stated,
                       .value_name = "TIME",
                       .help = "delay of the current channel behind the voltage channel, to be taken out",
                       .example = "4ns±1ns",
                       .unit = Unit::second},
                      {.name = "--current-probe-corner",
                       .kind = ValueKind::stated,
                       .value_name = "FREQ",
                       .help = "low corner frequency of the current probe, whose droop is taken out",
                       .example = "500Hz±20%",
                       .unit = Unit::hertz,
                       .range = positive},
                      {.name = "--dcr",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "DC resistance of the winding",
                       .example = "0.35ohm±1%",
                       .unit = Unit::ohm,
                       .range = positive}}};
}

Result<void> take_current(const Arguments& arguments, BenchSetup& bench) {
  ChannelSetup& current = bench.current;
  current.column = arguments.text("--current");
  current.low_column = arguments.text("--current-low");
  current.shunt = arguments.stated("--shunt");
  // A command that measures at direct current leaves out what only matters over time.
  const auto if_declared = [&](std::string_view option) {
    return arguments.command().find(option) != nullptr ? arguments.stated(option) : std::nullopt;
  };
  current.shunt_inductance = if_declared("--shunt-inductance");
  current.skew = if_declared("--skew");
  current.probe_corner = if_declared("--current-probe-corner");
  bench.winding_resistance = if_declared("--dcr");
  if (const auto typed = arguments.text("--current-gain")) {
    // Two kinds of factor: the unit tells which.
    const Unit unit = typed->find('V') != std::string::npos ? Unit::ampere_per_volt : Unit::one;
    const Result<StatedValue> gain = parse_value(*typed, unit, "--current-gain");
    if (!gain) return failure(gain);
    if (gain->value == 0) {
      return failure(Problem::bad_number, "--current-gain", "a factor of zero leaves no current",
                     "give it as 10A/V, or as a plain number");
    }
    current.gain = *gain;
  }
  return {};
}

}  // namespace coilassay

// coilassay simulate sine
#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/simulate_sine_run.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

Option parameter(std::string_view name, std::string_view value_name, Unit unit, Range range, std::string_view help,
                 std::string_view example) {
  return {.name = name,
          .kind = ValueKind::plain,
          .value_name = value_name,
          .help = help,
          .example = example,
          .unit = unit,
          .range = range};
}

/// The option of a parameter of the run: "--shunt-inductance" for "shunt_inductance".
std::string option_of(std::string_view parameter_name) {
  std::string name = "--" + std::string(parameter_name);
  for (char& c : name) c = c == '_' ? '-' : c;
  return name;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  SimulateSineJob job;
  for (const SineParameter& each : sine_parameters()) {
    if (const auto given = arguments.plain(option_of(each.name))) job.bench.*each.member = *given;
  }
  if (const auto samples = arguments.count("--samples")) job.bench.samples = static_cast<std::size_t>(*samples);
  if (const auto bits = arguments.count("--bits")) job.bench.bits = static_cast<int>(*bits);
  if (const auto seed = arguments.count("--seed")) job.bench.seed = *seed;
  job.bench.over_shunt = arguments.has("--over-shunt");
  const auto capture_file = arguments.text("-o");
  if (!capture_file) {
    return failure(Problem::usage, "-o", "it is not said where the capture goes",
                   "write it like -o sine.csv; '-' is standard output");
  }
  job.capture_file = *capture_file;
  job.truth_file = arguments.text("--truth");

  const bool quiet = arguments.has("--quiet");
  RunSession session(arguments, console, quiet);
  const auto truth = run_simulate_sine(job, session.context());
  session.end_progress();
  if (!truth) return failure(truth);
  if (!quiet && job.capture_file != "-") {
    const Script script = console.surroundings().script;
    console.say("wrote " + shown(job.capture_file) + ": f " + to_text(truth->f_hz, Unit::hertz, script) + ", L_s " +
                to_text(truth->l_s_h, Unit::henry, script) + ", R_s " + to_text(truth->r_s_ohm, Unit::ohm, script) + ", Q " +
                to_text(truth->q, Unit::one, script));
  }
  return ExitCode::done;
}

OptionGroup coil() {
  using enum Range;
  return {"Coil",
          {parameter("--inductance", "VALUE", Unit::henry, positive, "inductance, 1 mH unless given", "22uH"),
           parameter("--resistance", "VALUE", Unit::ohm, not_negative, "series resistance at this frequency, 2 Ω unless given",
                     "0.5ohm"),
           parameter("--parallel-capacitance", "VALUE", Unit::farad, not_negative, "the winding's own capacitance", "8pF"),
           parameter("--saturation", "NUMBER", Unit::one, not_negative,
                     "how the inductance falls with the bias i: L / (1 + NUMBER i²), in 1/A²", "2"),
           parameter("--third-harmonic", "RATIO", Unit::one, any, "of the current, relative to its fundamental", "0.05")}};
}

OptionGroup drive() {
  using enum Range;
  return {"Drive",
          {parameter("--frequency", "FREQ", Unit::hertz, positive, "10 kHz unless given", "100kHz"),
           parameter("--amplitude", "VALUE", Unit::volt, not_negative, "peak voltage over the coil, 1 V unless given", "0.5V"),
           parameter("--phase", "ANGLE", Unit::radian, any, "of the voltage at time 0, 0.4 rad unless given", "0.1"),
           parameter("--bias", "VALUE", Unit::ampere, any, "DC current through the coil", "0.5A")}};
}

OptionGroup current() {
  using enum Range;
  return {"Current channel",
          {parameter("--shunt", "VALUE", Unit::ohm, not_negative,
                     "sense resistor: the channel is then in volts; in ampere unless given", "0.1ohm"),
           parameter("--shunt-inductance", "VALUE", Unit::henry, not_negative, "of the sense resistor", "2nH"),
           parameter("--skew", "TIME", Unit::second, any, "delay behind the voltage channel", "4ns"),
           parameter("--current-probe-corner", "FREQ", Unit::hertz, not_negative, "low corner of a current probe", "500Hz"),
           parameter("--current-noise", "VALUE", Unit::ampere, not_negative, "r.m.s. noise", "1mA"),
           parameter("--current-offset", "VALUE", Unit::ampere, any, "of the channel", "10mA"),
           parameter("--current-scale", "RATIO", Unit::one, any, "what the scope shows of an ampere, 1 unless given", "1.02"),
           parameter("--current-full-scale", "VALUE", Unit::ampere, not_negative,
                     "largest current it can show; 1.2 times the largest unless given", "1A")}};
}

OptionGroup scope() {
  using enum Range;
  return {"Voltage channel and scope",
          {{.name = "--over-shunt", .help = "the voltage channel shows coil and shunt together"},
           parameter("--noise", "VALUE", Unit::volt, not_negative, "r.m.s. noise of the voltage", "2mV"),
           parameter("--offset", "VALUE", Unit::volt, any, "of the voltage channel", "10mV"),
           parameter("--scale", "RATIO", Unit::one, any, "what the scope shows of a volt, 1 unless given", "1.02"),
           parameter("--full-scale", "VALUE", Unit::volt, not_negative,
                     "largest voltage it can show; 1.2 times the largest unless given", "5V"),
           {.name = "--samples",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "length of the record, 10000 unless given",
            .example = "5000",
            .least = 2,
            .most = 100'000'000},
           parameter("--interval", "TIME", Unit::second, positive,
                     "between samples; the record holds 20.3 periods unless given", "20ns"),
           parameter("--timebase", "RATIO", Unit::one, any, "how much too long its seconds are", "25ppm"),
           {.name = "--bits",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the converter; not quantised unless given",
            .example = "8",
            .least = 1,
            .most = 24}}};
}

OptionGroup files() {
  return {"Files and seed",
          {{.name = "-o",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "the capture, as CSV; '-' is standard output",
            .example = "sine.csv"},
           {.name = "--truth",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "every parameter and the exact quantities of the coil at this frequency, as JSON",
            .example = "sine.json"},
           {.name = "--seed",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the noise, 1 unless given; the same seed gives the same file",
            .example = "7"}}};
}

}  // namespace

Command simulate_sine_command() {
  return {.name = "simulate sine",
          .summary = "a simulated steady sine, as a capture with its truth",
          .description =
              "Solves the circuit's phasors exactly and looks at them through a simulated two-channel scope. What a real "
              "bench would not tell, the truth, goes to a file of its own.",
          .groups = {files(), coil(), drive(), current(), scope(), everywhere_options()},
          .examples = {{"simulate sine -o sine.csv --truth sine.json --shunt 0.1ohm --bits 8",
                        "a capture to try sine on, and what it ought to find"}},
          .run = run};
}

}  // namespace coilassay

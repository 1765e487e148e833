// coilassay simulate resistance
#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/simulate_resistance_run.h"
#include "base/number_text.h"
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

Option count(std::string_view name, std::string_view help, std::string_view example, std::uint64_t least, std::uint64_t most) {
  return {.name = name, .kind = ValueKind::count, .value_name = "N", .help = help, .example = example, .least = least, .most = most};
}

/// The option of a parameter of the run: "--thermal-offset" for "thermal_offset".
std::string option_of(std::string_view parameter_name) {
  std::string name = "--" + std::string(parameter_name);
  for (char& c : name) c = c == '_' ? '-' : c;
  return name;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  SimulateResistanceJob job;
  for (const DrivenResistanceParameter& each : driven_resistance_parameters()) {
    if (const auto given = arguments.plain(option_of(each.name))) job.bench.*each.member = *given;
  }
  if (const auto readings = arguments.count("--readings")) job.bench.readings = static_cast<std::size_t>(*readings);
  if (const auto turn = arguments.count("--before-reversal")) job.bench.before_reversal = static_cast<std::size_t>(*turn);
  if (const auto seed = arguments.count("--seed")) job.bench.seed = *seed;
  job.bench.one_polarity = arguments.has("--one-polarity");
  const auto capture_file = arguments.text("-o");
  if (!capture_file) {
    return failure(Problem::usage, "-o", "it is not said where the readings go",
                   "write it like -o readings.csv; '-' is standard output");
  }
  job.capture_file = *capture_file;
  job.truth_file = arguments.text("--truth");

  const bool quiet = arguments.has("--quiet");
  RunSession session(arguments, console, quiet);
  const auto truth = run_simulate_resistance(job, session.context());
  session.end_progress();
  if (!truth) return failure(truth);
  if (!quiet && job.capture_file != "-") {
    const Script script = console.surroundings().script;
    console.say("wrote " + shown(job.capture_file) + ": R_dc " + to_text(truth->r_dc_ohm, Unit::ohm, script) + ", R_dc_20 " +
                to_text(truth->r_dc_20_ohm, Unit::ohm, script));
  }
  return ExitCode::done;
}

OptionGroup files() {
  return {"Files and seed",
          {{.name = "-o",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "the readings, as CSV; '-' is standard output",
            .example = "readings.csv"},
           {.name = "--truth",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "every parameter and the true resistances, as JSON",
            .example = "readings.json"},
           {.name = "--seed",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the noise, 1 unless given; the same seed gives the same file",
            .example = "7"}}};
}

OptionGroup winding() {
  using enum Range;
  return {"Winding",
          {parameter("--resistance", "VALUE", Unit::ohm, positive, "at 20 °C, 0.35 Ω unless given", "0.5ohm"),
           parameter("--temperature-coefficient", "NUMBER", Unit::one, any, "in 1/K, 0.00393 unless given", "0.00403"),
           parameter("--temperature", "VALUE", Unit::degree_celsius, above_absolute_zero,
                     "of air and winding at first, 23 °C unless given", "25degC"),
           parameter("--thermal-resistance", "NUMBER", Unit::one, not_negative,
                     "kelvin that the winding warms per watt, none unless given", "40"),
           parameter("--thermal-time", "TIME", Unit::second, positive, "its time constant, 60 s unless given", "30s"),
           parameter("--preheat", "TIME", Unit::second, not_negative, "how long the current flowed before", "10s")}};
}

OptionGroup readings() {
  using enum Range;
  return {"Readings",
          {count("--readings", "how many, 20 unless given", "40", 1, 10'000'000),
           parameter("--interval", "TIME", Unit::second, positive, "between readings, 2 s unless given", "1s"),
           parameter("--current", "VALUE", Unit::ampere, positive, "through the winding, 1 A unless given", "0.5A"),
           count("--before-reversal", "readings of one polarity before the current is reversed, 1 unless given", "10", 1,
                 10'000'000),
           {.name = "--one-polarity", .help = "the current is never reversed"},
           parameter("--ripple", "VALUE", Unit::ampere, not_negative, "r.m.s. by which the current itself varies", "1mA")}};
}

OptionGroup meters() {
  using enum Range;
  return {"Meters",
          {parameter("--thermal-offset", "VALUE", Unit::volt, any, "in series with the voltmeter", "5uV"),
           parameter("--noise", "VALUE", Unit::volt, not_negative, "r.m.s. of the voltage readings", "10uV"),
           parameter("--current-noise", "VALUE", Unit::ampere, not_negative, "r.m.s. of the current readings", "50uA"),
           parameter("--scale", "RATIO", Unit::one, positive, "what the voltmeter shows of a volt, 1 unless given", "1.002"),
           parameter("--current-scale", "RATIO", Unit::one, positive, "what the ammeter shows of an ampere", "0.997"),
           parameter("--digit", "VALUE", Unit::volt, not_negative, "last digit of the voltmeter; not rounded unless given",
                     "10uV"),
           parameter("--current-digit", "VALUE", Unit::ampere, not_negative, "last digit of the ammeter (V with --shunt)",
                     "100uA"),
           parameter("--shunt", "VALUE", Unit::ohm, not_negative, "the second column is the voltage across it", "0.1ohm")}};
}

}  // namespace

Command simulate_resistance_command() {
  return {.name = "simulate resistance",
          .summary = "simulated four-wire readings, as a table with their truth",
          .description = "A winding carries a direct current that warms it and is turned round between readings; two meters read "
                         "voltage and current. The truth goes to a file of its own.",
          .groups = {files(), winding(), readings(), meters(), everywhere_options()},
          .examples = {{"simulate resistance -o r.csv --truth r.json --thermal-offset 8uV",
                        "readings to try resistance on, and what it ought to find"}},
          .run = run};
}

}  // namespace coilassay

// coilassay simulate sweep
#include <cmath>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/simulate_sweep_run.h"
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

Option number_of(std::string_view name, std::uint64_t least, std::string_view help, std::string_view example) {
  return {.name = name, .kind = ValueKind::count, .value_name = "N", .help = help, .example = example, .least = least, .most = 1'000'000};
}

/// The option of a parameter of the run: "--parallel-capacitance" for "parallel_capacitance".
std::string option_of(std::string_view parameter_name) {
  std::string name = "--" + std::string(parameter_name);
  for (char& c : name) c = c == '_' ? '-' : c;
  return name;
}

SweepColumns columns_of(const Arguments& arguments) {
  const std::string typed = arguments.text("--columns").value_or("Z");
  if (typed == "S") return SweepColumns::scattering;
  if (typed == "L") return SweepColumns::inductance;
  if (typed == "phase") return SweepColumns::magnitude_phase;
  if (typed == "magnitude") return SweepColumns::magnitude;
  return SweepColumns::impedance;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  SimulateSweepJob job;
  for (const SweepParameter& each : sweep_parameters()) {
    if (const auto given = arguments.plain(option_of(each.name))) job.bench.*each.member = *given;
  }
  if (const auto shift = arguments.plain("--scattering-error")) job.bench.scattering_error = *shift;
  if (const auto points = arguments.count("--points")) job.bench.points = static_cast<std::size_t>(*points);
  if (const auto outliers = arguments.count("--outliers")) job.bench.outliers = static_cast<std::size_t>(*outliers);
  if (const auto marked = arguments.count("--marked-points")) job.bench.marked = static_cast<std::size_t>(*marked);
  if (const auto seed = arguments.count("--seed")) job.bench.seed = *seed;
  job.bench.linear = arguments.has("--linear");
  job.columns = columns_of(arguments);
  const auto sweep_file = arguments.text("-o");
  if (!sweep_file) {
    return failure(Problem::usage, "-o", "it is not said where the sweep goes",
                   "write it like -o coil.csv or -o coil.s1p; '-' is standard output");
  }
  if (sweep_file->ends_with(".s1p") && arguments.has("--columns")) {
    return failure(Problem::usage, "--columns", "a Touchstone file has no choice of columns", "leave it out, or write a .csv file");
  }
  job.sweep_file = *sweep_file;
  job.truth_file = arguments.text("--truth");

  const bool quiet = arguments.has("--quiet");
  RunSession session(arguments, console, quiet);
  const auto truth = run_simulate_sweep(job, session.context());
  session.end_progress();
  if (!truth) return failure(truth);
  if (!quiet && job.sweep_file != "-") {
    const Script script = console.surroundings().script;
    const std::string resonance = std::isfinite(truth->f_r_hz) ? "f_r " + to_text(truth->f_r_hz, Unit::hertz, script) : "no self-resonance";
    console.say("wrote " + shown(job.sweep_file) + ": L " + to_text(job.bench.inductance_h, Unit::henry, script) + ", " + resonance);
  }
  return ExitCode::done;
}

OptionGroup coil() {
  using enum Range;
  return {"Coil",
          {parameter("--inductance", "VALUE", Unit::henry, positive, "at low frequency, 100 µH unless given", "22uH"),
           parameter("--resistance", "VALUE", Unit::ohm, not_negative, "at direct current, 0.5 Ω unless given", "50mohm"),
           parameter("--skin-resistance", "VALUE", Unit::ohm, not_negative,
                     "what the skin effect adds at its frequency; grows with the root of f, its reactance included", "0.3ohm"),
           parameter("--skin-frequency", "FREQ", Unit::hertz, positive, "where it has that value, 1 MHz unless given", "100kHz"),
           parameter("--proximity-resistance", "VALUE", Unit::ohm, not_negative,
                     "plateau of the proximity or core loss, which grows with f² below its corner", "2ohm"),
           parameter("--proximity-frequency", "FREQ", Unit::hertz, positive, "its corner, 10 MHz unless given", "1MHz"),
           parameter("--parallel-capacitance", "VALUE", Unit::farad, not_negative, "of the winding, 10 pF unless given", "8pF"),
           parameter("--parallel-resistance", "VALUE", Unit::ohm, not_negative, "parallel loss; none unless given", "20kohm"),
           parameter("--second-frequency", "FREQ", Unit::hertz, not_negative, "a second tank across the coil: where it is a short", "20MHz"),
           parameter("--second-capacitance", "VALUE", Unit::farad, positive, "its capacitance, 1 pF unless given", "2pF"),
           parameter("--second-q", "NUMBER", Unit::one, positive, "its quality factor, 20 unless given", "30")}};
}

OptionGroup grid() {
  using enum Range;
  return {"Frequencies",
          {parameter("--start", "FREQ", Unit::hertz, positive, "lowest, 1 kHz unless given", "100Hz"),
           parameter("--stop", "FREQ", Unit::hertz, positive, "highest, 30 MHz unless given", "10MHz"),
           number_of("--points", 2, "how many, 201 unless given", "401"),
           {.name = "--linear", .help = "even steps; even ratios unless given"}}};
}

OptionGroup analyser() {
  using enum Range;
  return {"Fixture and analyser",
          {parameter("--residual-inductance", "VALUE", Unit::henry, any, "left over in series", "5nH"),
           parameter("--residual-resistance", "VALUE", Unit::ohm, any, "likewise", "10mohm"),
           parameter("--residual-capacitance", "VALUE", Unit::farad, any, "left over across the coil", "1pF"),
           parameter("--residual-conductance", "VALUE", Unit::siemens, any, "likewise", "10nS"),
           parameter("--noise", "RATIO", Unit::one, not_negative, "of Z, standard deviation in size and angle", "0.1%"),
           parameter("--scattering-noise", "RATIO", Unit::one, not_negative, "of S, standard deviation of each part", "0.0001"),
           parameter("--reference", "VALUE", Unit::ohm, positive, "of S, 50 Ω unless given", "75ohm"),
           parameter("--scale", "RATIO", Unit::one, positive, "what it shows of an ohm, 1 unless given", "1.001"),
           parameter("--phase-error", "ANGLE", Unit::radian, any, "added to every angle", "1mrad"),
           parameter("--scattering-error", "RATIO", Unit::one, any, "added to every S", "0.001"),
           parameter("--step", "RATIO", Unit::one, any, "a range change gone wrong: that much more from its frequency on", "2%"),
           parameter("--step-frequency", "FREQ", Unit::hertz, not_negative, "where it changes range", "1MHz"),
           number_of("--outliers", 0, "points thrown off by 30 %, not marked", "3"),
           number_of("--marked-points", 0, "points of nonsense that the status marks as bad", "2")}};
}

OptionGroup files() {
  return {"Files and seed",
          {{.name = "-o",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "the sweep, as Touchstone when it ends in .s1p, else as CSV; '-' is standard output",
            .example = "coil.csv"},
           {.name = "--columns",
            .kind = ValueKind::choice,
            .value_name = "WHICH",
            .help = "of the CSV: Z or S in real and imaginary part, L with R, size with phase, or the size alone; Z unless given",
            .example = "L",
            .choices = {"Z", "S", "L", "phase", "magnitude"}},
           {.name = "--truth",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "every parameter, the self-resonance and the spoilt points, as JSON",
            .example = "coil.json"},
           {.name = "--seed",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the noise, 1 unless given; the same seed gives the same file",
            .example = "7"}}};
}

}  // namespace

Command simulate_sweep_command() {
  return {.name = "simulate sweep",
          .summary = "a simulated impedance sweep, with its truth",
          .description =
              "Works out the coil's circuit at each frequency in closed form and looks at it through an imperfect analyser. What "
              "a real one would not tell, the truth, goes to a file of its own.",
          .groups = {files(), coil(), grid(), analyser(), everywhere_options()},
          .examples = {{"simulate sweep -o coil.csv --truth coil.json --noise 0.1%",
                        "a sweep to try sweep on, and what it ought to find"},
                       {"simulate sweep -o coil.s1p --scattering-noise 0.0002",
                        "the same as a network analyser would write it"}},
          .run = run};
}

}  // namespace coilassay

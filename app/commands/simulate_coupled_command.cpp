// coilassay simulate coupled
#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/simulate_coupled_run.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

Option parameter(std::string_view name, std::string_view value_name, Unit unit, Range range, std::string_view help,
                 std::string_view example, bool repeatable = false) {
  return {.name = name,
          .kind = ValueKind::plain,
          .value_name = value_name,
          .help = help,
          .example = example,
          .unit = unit,
          .range = range,
          .repeatable = repeatable};
}

/// One value for each winding, in order; fewer leave the others as they are.
Result<void> take_each(const Arguments& arguments, std::string_view option, std::vector<synthetic::Winding>& windings,
                       double synthetic::Winding::*member) {
  const std::vector<double> values = arguments.all_plain(option);
  if (values.size() > windings.size()) {
    return failure(Problem::usage, std::string(option), "there are more values than windings", "give one --inductance for each winding, two or three");
  }
  for (std::size_t i = 0; i < values.size(); ++i) windings[i].*member = values[i];
  return {};
}

Result<SimulateCoupledJob> job_of(const Arguments& arguments) {
  SimulateCoupledJob job;
  synthetic::CoupledWindings& w = job.windings;
  const std::size_t count = arguments.all_plain("--inductance").size();
  if (count == 3) {
    w.windings.resize(3);
    w.coupling = {0.5, 0.3, 0.3};
  }
  for (const auto& [option, member] : {std::pair{"--inductance", &synthetic::Winding::inductance_h}, std::pair{"--resistance", &synthetic::Winding::resistance_ohm},
                                       std::pair{"--skin-resistance", &synthetic::Winding::skin_ohm}, std::pair{"--capacitance", &synthetic::Winding::capacitance_f}}) {
    if (const auto taken = take_each(arguments, option, w.windings, member); !taken) return failure(taken);
  }
  const std::vector<double> couplings = arguments.all_plain("--coupling");
  if (couplings.size() > w.coupling.size()) {
    return failure(Problem::usage, "--coupling", "there are more couplings than pairs of windings", "give one for each pair: 1-2, 1-3, 2-3");
  }
  std::copy(couplings.begin(), couplings.end(), w.coupling.begin());
  if (arguments.has("--reversed-dots")) {
    // The second winding's ends are exchanged.
    w.coupling[0] = -w.coupling[0];
    if (w.coupling.size() == 3) w.coupling[2] = -w.coupling[2];
  }
  w.swapped_ports = arguments.has("--swapped-ports");
  const auto take = [&](std::string_view option, double& value) {
    if (const auto given = arguments.plain(option)) value = *given;
  };
  take("--link-inductance", w.link_h);
  take("--link-resistance", w.link_ohm);
  take("--not-reciprocal", w.not_reciprocal);
  take("--noise", w.noise_ratio);
  take("--first", w.first_hz);
  take("--last", w.last_hz);
  if (const auto points = arguments.count("--points")) w.points = static_cast<std::size_t>(*points);
  if (const auto seed = arguments.count("--seed")) w.seed = *seed;
  const auto output = arguments.text("-o");
  if (!output) {
    return failure(Problem::usage, "-o", "it is not said where the files go", "write it like -o pair.s2p, or -o pair for one table each connection");
  }
  job.output = *output;
  job.truth_file = arguments.text("--truth");
  return job;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const Result<SimulateCoupledJob> job = job_of(arguments);
  if (!job) return failure(job);
  const bool quiet = arguments.has("--quiet");
  RunSession session(arguments, console, quiet);
  const auto done = run_simulate_coupled(*job, session.context());
  session.end_progress();
  if (!done) return failure(done);
  if (!quiet) {
    const Script script = console.surroundings().script;
    const std::string files = done->files.size() == 1 ? shown(done->files.front()) : std::to_string(done->files.size()) + " tables, " + shown(done->files.front()) + " and so on";
    console.say("wrote " + files + ": L_1 " + to_text(done->truth.l1_h, Unit::henry, script) + ", L_2 " + to_text(done->truth.l2_h, Unit::henry, script) +
                ", k " + to_text(done->truth.k, Unit::one, script));
  }
  return ExitCode::done;
}

OptionGroup windings() {
  using enum Range;
  return {"Windings (repeat an option for the next winding)",
          {parameter("--inductance", "VALUE", Unit::henry, positive, "two windings of 100 µH unless given; three values make three windings", "100uH", true),
           parameter("--resistance", "VALUE", Unit::ohm, not_negative, "in series with it", "0.2ohm", true),
           parameter("--skin-resistance", "VALUE", Unit::ohm, not_negative, "of the skin law (1+j) R sqrt(f) at 1 MHz", "0.5ohm", true),
           parameter("--capacitance", "VALUE", Unit::farad, not_negative, "across it", "30pF", true),
           parameter("--coupling", "K", Unit::one, any, "0.5 unless given; of three windings those of 1-2, 1-3 and 2-3", "0.9", true),
           {.name = "--reversed-dots", .help = "the ends of the second winding are exchanged"}}};
}

OptionGroup bench() {
  using enum Range;
  return {"Bench",
          {parameter("--link-inductance", "VALUE", Unit::henry, not_negative, "of what serves as a short", "12nH"),
           parameter("--link-resistance", "VALUE", Unit::ohm, not_negative, "of what serves as a short", "3mohm"),
           {.name = "--swapped-ports", .help = "the analyser's leads are exchanged: what files call 1 is winding 2"},
           parameter("--not-reciprocal", "RATIO", Unit::one, any, "by which Z12 of a port file is larger than Z21", "3%"),
           parameter("--noise", "RATIO", Unit::one, not_negative, "of every impedance, relative to its size", "0.1%"),
           parameter("--first", "FREQ", Unit::hertz, positive, "first frequency, 1 kHz unless given", "10kHz"),
           parameter("--last", "FREQ", Unit::hertz, positive, "last frequency, 1 MHz unless given", "500kHz"),
           {.name = "--points",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "frequencies, even in ratio, 61 unless given",
            .example = "101",
            .least = 1,
            .most = 1'000'000}}};
}

OptionGroup files() {
  return {"Files and seed",
          {{.name = "-o",
            .kind = ValueKind::file,
            .value_name = "NAME",
            .help = "NAME.s2p or .s3p: a Touchstone file; any other: one table each connection, NAME-primary-open.csv and so on",
            .example = "pair.s2p"},
           {.name = "--truth",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "every parameter and the exact quantities of the first two windings, as JSON",
            .example = "pair.json"},
           {.name = "--seed",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the noise, 1 unless given; the same seed gives the same files",
            .example = "7"}}};
}

}  // namespace

Command simulate_coupled_command() {
  return {.name = "simulate coupled",
          .summary = "simulated coupled windings, as files with their truth",
          .description =
              "Solves the circuit of two or three coupled windings exactly, for every way they can be connected: each open and "
              "shorted by an imperfect link, in series, or as ports.",
          .groups = {files(), windings(), bench(), everywhere_options()},
          .examples = {{"simulate coupled -o pair.s2p --truth p.json --coupling 0.97",
                        "a two-port file to try coupling on, and what it ought to find"},
                       {"simulate coupled -o coils --inductance 24uH --inductance 60uH",
                        "six tables, coils-primary-open.csv and so on"}},
          .run = run};
}

}  // namespace coilassay

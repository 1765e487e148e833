// coilassay simulate instrument
#include <ostream>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/commands/stop_signal.h"
#include "app/runs/simulate_instrument_run.h"

namespace coilassay {

namespace {

Option parameter(std::string_view name, std::string_view value_name, Unit unit, Range range, std::string_view help, std::string_view example) {
  return {.name = name, .kind = ValueKind::plain, .value_name = value_name, .help = help, .example = example, .unit = unit, .range = range};
}

/// A share of all replies.
Option share(std::string_view name, std::string_view help) {
  return {.name = name, .kind = ValueKind::plain, .value_name = "RATIO", .help = help, .example = "1%", .unit = Unit::one, .range = Range::not_negative};
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  SimulateInstrumentJob job;
  job.profile = arguments.words().front();
  const auto listen = arguments.text("--listen");
  if (!listen) return failure(Problem::usage, "--listen", "it is not said where it listens", "write it like --listen localhost:5025");
  job.listen = *listen;
  synthetic::StandInSetup& setup = job.setup;
  synthetic::Misbehaviour& wrong = setup.misbehaviour;
  for (const auto& [option, value] : {std::pair{"--inductance", &setup.coil.inductance_h}, {"--resistance", &setup.coil.resistance_ohm},
                                      {"--parallel-capacitance", &setup.coil.parallel_capacitance_f}, {"--frequency", &setup.frequency_hz},
                                      {"--spread", &setup.spread}, {"--every", &job.line_every_s}, {"--late", &wrong.late}, {"--split", &wrong.split},
                                      {"--garbled", &wrong.garbled}, {"--doubled", &wrong.doubled}, {"--over-range", &wrong.over_range},
                                      {"--silent", &wrong.silent}, {"--slow", &wrong.slow}, {"--gone", &wrong.gone}}) {
    if (const auto given = arguments.plain(option)) *value = *given;
  }
  wrong.echo = arguments.has("--echo");
  wrong.another_identity = arguments.has("--another-identity");
  setup.readings_per_part = arguments.count("--readings-per-part").value_or(1);
  setup.seed = arguments.count("--seed").value_or(1);
  setup.identity = arguments.text("--identity").value_or("");
  const bool quiet = arguments.has("--quiet");
  const StopSignal signal;
  job.stopped = StopSignal::came;
  job.listening = [&](unsigned short port) {
    // Whoever started this waits for the line.
    console.out() << "listening on port " << port << std::endl;
    if (!quiet) console.say("Ctrl-C ends it");
  };
  if (const auto ended = run_simulate_instrument(job); !ended) return failure(ended);
  return ExitCode::done;
}

}  // namespace

Command simulate_instrument_command() {
  using enum Range;
  return {.name = "simulate instrument",
          .summary = "a stand-in for a meter, to try a profile without one",
          .description =
              "Answers the questions of an instrument profile from a simulated coil, on a TCP port of this machine, until it is "
              "stopped. It can be told to misbehave the way real lines do.\n"
              "Only this machine can reach it. With port 0 the system chooses one; the line on standard output says which.",
          .positional = {.name = "PROFILE.toml", .help = "the profile whose questions it answers; its [link] port is not used", .least = 1, .most = 1},
          .groups = {{"Instrument",
                      {{.name = "--listen", .kind = ValueKind::text, .value_name = "HOST:PORT", .help = "where it listens; needed", .example = "localhost:5025"},
                       {.name = "--identity", .kind = ValueKind::text, .value_name = "TEXT", .help = "what it answers to the question who it is; made from the profile unless given", .example = "bench-lcr,7"},
                       parameter("--every", "TIME", Unit::second, positive, "between lines of one that prints unasked, 100 ms unless given", "1s"),
                       {.name = "--seed", .kind = ValueKind::count, .value_name = "N", .help = "of everything that is drawn, 1 unless given", .example = "7"}}},
                     {"Coil",
                      {parameter("--inductance", "VALUE", Unit::henry, positive, "inductance, 47 µH unless given", "22uH"),
                       parameter("--resistance", "VALUE", Unit::ohm, not_negative, "series resistance, 0.35 Ω unless given", "0.5ohm"),
                       parameter("--parallel-capacitance", "VALUE", Unit::farad, not_negative, "the winding's own capacitance", "8pF"),
                       parameter("--frequency", "FREQ", Unit::hertz, positive, "that of the profile, else 1 kHz, unless given", "100kHz"),
                       parameter("--spread", "RATIO", Unit::one, not_negative, "a new part after its readings: L and R scatter by this share", "2%"),
                       {.name = "--readings-per-part", .kind = ValueKind::count, .value_name = "N", .help = "readings before the next part, 1 unless given", .example = "3", .least = 1}}},
                     {"Misbehaviour, as shares of all replies",
                      {share("--late", "after the time-out, within the profile's lateness"), share("--split", "in two pieces"),
                       share("--garbled", "with damaged bytes"), share("--doubled", "twice"), share("--over-range", "9.9E37 for every value"),
                       share("--silent", "not at all"), share("--slow", "byte by byte"), share("--gone", "the line is dropped before, within or after it"),
                       {.name = "--echo", .help = "every question is sent back first"},
                       {.name = "--another-identity", .help = "once the line was dropped, another instrument answers"}}},
                     everywhere_options()},
          .examples = {{"simulate instrument meter.toml --listen localhost:5025", "a meter that behaves"},
                       {"simulate instrument meter.toml --listen localhost:0 --late 5%", "and one that sometimes answers too late"}},
          .run = run};
}

}  // namespace coilassay

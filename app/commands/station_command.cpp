// coilassay station
#include <unistd.h>

#include <memory>
#include <nlohmann/json.hpp>
#include <ostream>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/commands/station_screen.h"
#include "app/commands/stop_signal.h"
#include "app/runs/station_run.h"
#include "base/outside_text.h"
#include "report/json_writer.h"
#include "report/lot_json.h"
#include "report/lot_text.h"
#include "report/result_json.h"

namespace coilassay {

namespace {

/// The error document with the place where the ledger ends: what stands in it is safe.
std::string broken_document(const StationEnd& end, const std::string& ledger) {
  nlohmann::ordered_json document = nlohmann::ordered_json::parse(to_json(*end.broke));
  document["ledger"] = {{"file", json_safe(ledger)}, {"last", end.head.id}, {"head", end.head.hash}};
  return json_text(document);
}

ExitCode exit_code_of(LotResult decision) {
  switch (decision) {
    case LotResult::accept: return ExitCode::done;
    case LotResult::reject: return ExitCode::rejected;
    case LotResult::undecided: break;
  }
  return ExitCode::undecided;
}

ExitCode finish(const StationEnd& end, const StationJob& job, const Arguments& arguments, Console& console) {
  const bool json = arguments.has("--json"), follow = arguments.has("--follow");
  if (end.broke) {
    if (follow) {
      console.out() << nlohmann::ordered_json::parse(broken_document(end, job.ledger)).dump() << '\n' << std::flush;
    } else if (json) {
      console.out() << broken_document(end, job.ledger);
    }
    if (!json) {
      console.show(*end.broke);
      console.say("the ledger " + shown(job.ledger, 100) + " holds " + std::to_string(end.head.id) + " entries, the last with hash " + end.head.hash +
                  "; start again with the same lot to go on");
    }
    return ExitCode::broken;
  }
  if (follow) {
    console.out() << to_json_line(end.record) << std::flush;
  } else if (json) {
    console.out() << to_json(end.record);
  } else {
    TextStyle style = console.out_style();
    style.verbose = arguments.has("--verbose");
    console.out() << '\n' << to_text(end.record, style);
  }
  return exit_code_of(end.record.decision.decision);
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  StationJob job;
  job.sheet = arguments.words().front();
  job.profiles = arguments.all_texts("--instrument");
  const bool json = arguments.has("--json"), follow = arguments.has("--follow"), quiet = arguments.has("--quiet");
  const auto ledger = arguments.text("--ledger"), lot = arguments.text("--lot");
  if (job.profiles.empty()) return failure(Problem::usage, "--instrument", "it is not said what measures", "write it like --instrument meter.toml");
  if (!lot) return failure(Problem::usage, "--lot", "the lot has no name", "write it like --lot 0412; the same name goes on with the same lot");
  if (!ledger) return failure(Problem::usage, "--ledger", "a station shows no verdict that is not recorded", "write it like --ledger drum-47.ledger; it is made when it is not there");
  job.ledger = *ledger;
  job.lot = *lot;
  job.lot_size = arguments.count("--lot-size");
  job.operator_name = arguments.text("--operator").value_or("");
  job.trace = arguments.text("--trace");
  job.count_serials = arguments.has("--count-serials");
  job.clock = [&console] { return console.now(); };
  const StopSignal signal;
  job.stopped = StopSignal::came;
  DescriptorLines input(STDIN_FILENO);
  job.input = &input;

  const Surroundings& around = console.surroundings();
  const bool screen = around.out_is_terminal && !json && !follow;
  // With a document on standard output, what the operator sees goes beside it.
  StationLines lines(json || follow ? console.error() : console.out(), console.error(), json || follow ? console.error_style() : console.out_style(), quiet);
  StationFollower follower(console.out(), lines);
  StationScreen terminal(console.out(), console.out_style());
  if (follow) job.view = &follower;
  else if (screen) job.view = &terminal;
  else job.view = &lines;

  RunSession session(arguments, console, true);
  const auto end = run_station(job, session.context());
  if (!end) return failure(end);
  return finish(*end, job, arguments, console);
}

OptionGroup lot_group() {
  return {"Lot and record",
          {{.name = "--instrument", .kind = ValueKind::file, .value_name = "PROFILE.toml", .help = "what measures; given again, a limit is served by the first that yields its quantity at its conditions", .example = "meter.toml", .repeatable = true},
           {.name = "--lot", .kind = ValueKind::text, .value_name = "NAME", .help = "name of the lot; needed. The same name goes on with the same lot", .example = "0412"},
           {.name = "--ledger", .kind = ValueKind::file, .value_name = "FILE", .help = "where verdicts are recorded before they are shown; needed, made when it is not there", .example = "drum-47.ledger"},
           {.name = "--lot-size", .kind = ValueKind::count, .value_name = "N", .help = "units of the whole lot, so that the plan is known from the start; else the units measured", .example = "500", .least = 1, .most = 1'000'000'000},
           {.name = "--operator", .kind = ValueKind::text, .value_name = "NAME", .help = "who inspects; stands in the record", .example = "Ada"},
           {.name = "--count-serials", .help = "no scanner: parts are numbered as they are put in; the profile's [present] tells when"}}};
}

OptionGroup output_group() {
  return {"Output",
          {{.name = "--json", .help = "one JSON document of the lot at the end; the operator's lines go to standard error"},
           {.name = "--follow", .help = "a line of JSON for each unit once it is recorded, the lot's document as the last line"},
           {.name = "--verbose", .help = "more about the lot at the end"},
           {.name = "--trace", .kind = ValueKind::file, .value_name = "FILE", .help = "a log of every byte to and from the instrument", .example = "talk.trace"}}};
}

}  // namespace

Command station_command() {
  return {.name = "station",
          .summary = "parts through a fixture, judged and recorded one by one",
          .description =
              "Takes serial numbers from standard input, one a line, as a scanner types them. For each it looks whether a part is "
              "there and touched well, asks the instrument, judges by the part sheet, stores the verdict in the ledger, and only then "
              "shows it: word, shape and bell, in letters one sees from two metres on a terminal, plain lines elsewhere. At the end of input the lot is decided.\n"
              "Lines that begin with ':' are commands. :again REASON measures the last unit once more (the number of a reason in "
              "the sheet, or words), :aside sets it aside, :check measures the check standard, :quit ends. Nothing is ever asked back.\n"
              "Exit code: 0 accepted, 1 rejected, 3 undecided, 4 when instrument or ledger are gone for good; what was recorded stays, "
              "and the same command goes on.",
          .positional = {.name = "PART.toml", .help = "the part sheet", .least = 1, .most = 1},
          .groups = {lot_group(), output_group(), everywhere_options()},
          .examples = {{"station drum.toml --instrument lcr.toml --lot 7 --ledger d.ledger", "an operator, a scanner and a meter"},
                       {"station a.toml --instrument b.toml --lot 7 --ledger a.db --follow", "the same for another program"}},
          .run = run};
}

}  // namespace coilassay

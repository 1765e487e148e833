// coilassay inspect
#include <ostream>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/inspect_run.h"
#include "app/runs/lot_outputs.h"
#include "app/runs/version.h"
#include "report/lot_json.h"
#include "report/lot_text.h"

namespace coilassay {

namespace {

Result<ExitCode> explain_sheet(const Arguments& arguments, Console& console, const std::string& path) {
  const Result<PartSheet> sheet = read_part_sheet(path);
  if (!sheet) return failure(sheet);
  const SheetCheck check = check_sheet(*sheet, arguments.count("--lot-size"));
  console.out() << (arguments.has("--json") ? to_json(check) : to_text(check, console.out_style()));
  return check.usable() ? ExitCode::done : ExitCode::rejected;
}

ExitCode exit_code_of(LotResult decision) {
  switch (decision) {
    case LotResult::accept: return ExitCode::done;
    case LotResult::reject: return ExitCode::rejected;
    case LotResult::undecided: break;
  }
  return ExitCode::undecided;
}

void show(const LotRecord& lot, const Arguments& arguments, Console& console, bool written) {
  const bool json = arguments.has("--json"), follow = arguments.has("--follow");
  if (follow) {
    console.out() << to_json_line(lot) << std::flush;
  } else if (json && written) {
    console.out() << to_json(lot);
  } else {
    // With --json and a failure, standard output belongs to the error document.
    TextStyle style = json ? console.error_style() : console.out_style();
    style.verbose = arguments.has("--verbose");
    (json ? console.error() : console.out()) << to_text(lot, style);
  }
  if (!lot.ledger && (json || follow) && !arguments.has("--quiet")) {
    console.say("nothing was recorded: a ledger keeps verdicts, with --ledger FILE");
  }
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const std::vector<std::string>& words = arguments.words();
  if (arguments.has("--check-sheet")) {
    if (words.size() > 1) {
      return failure(Problem::usage, "--check-sheet", "only the sheet is looked at, no captures",
                     "leave the folder out");
    }
    return explain_sheet(arguments, console, words.front());
  }
  if (words.size() < 2) {
    return failure(Problem::usage, "coilassay inspect", "the folder with the captures of the lot is missing",
                   "coilassay inspect PART.toml FOLDER");
  }
  InspectJob job;
  job.sheet = words[0];
  job.folder = words[1];
  job.ledger = arguments.text("--ledger");
  job.lot = arguments.text("--lot");
  job.lot_size = arguments.count("--lot-size");
  job.operator_name = arguments.text("--operator").value_or("");
  job.reason = arguments.text("--reason");
  const std::optional<std::string> report = arguments.text("--report");
  job.report = report;
  job.for_page = report.has_value();
  if (const Result<void> fine = check_outputs({.figure = std::nullopt, .report = report}); !fine) return failure(fine);
  if (job.reason && !job.ledger) {
    return failure(Problem::usage, "--reason", "without a ledger there is no earlier attempt it could be about",
                   "add --ledger FILE, or leave it out");
  }
  const bool follow = arguments.has("--follow");
  RunSession session(arguments, console, arguments.has("--quiet"));
  const UnitFollower each = [&console](const UnitDone& unit) {
    console.out() << unit_line(unit.attempt, unit.standing, unit.entry, unit.from_ledger) << std::flush;
  };
  const Result<LotRecord> lot = run_inspect(job, session.context(), follow ? each : UnitFollower{});
  session.end_progress();
  if (!lot) return failure(lot);
  const Result<void> written = report ? write_lot_report(*lot, *report, session.context()) : Result<void>{};
  show(*lot, arguments, console, written.has_value());
  if (!written) return failure(written);
  return exit_code_of(lot->decision.decision);
}

OptionGroup lot_options() {
  return {.title = "Lot and record",
          .options = {{.name = "--ledger",
                       .kind = ValueKind::file,
                       .value_name = "FILE",
                       .help = "where verdicts are recorded; made when it is not there. A run that was cut off goes on "
                               "after its last entry",
                       .example = "drum-47.ledger"},
                      {.name = "--lot",
                       .kind = ValueKind::text,
                       .value_name = "NAME",
                       .help = "name of the lot; the folder's name unless given",
                       .example = "0412"},
                      {.name = "--lot-size",
                       .kind = ValueKind::count,
                       .value_name = "N",
                       .help = "units of the whole lot, when not all of them are here; else the units present",
                       .example = "500",
                       .least = 1,
                       .most = 1'000'000'000},
                      {.name = "--operator",
                       .kind = ValueKind::text,
                       .value_name = "NAME",
                       .help = "who inspects; stands in the record",
                       .example = "Ada"},
                      {.name = "--reason",
                       .kind = ValueKind::text,
                       .value_name = "TEXT",
                       .help = "why units that were inspected before are inspected from other captures",
                       .example = "reseated in the fixture"},
                      {.name = "--check-sheet",
                       .help = "explains the part sheet in plain words and names what in it cannot work; nothing is "
                               "measured"}}};
}

OptionGroup lot_output_options() {
  return {.title = "Output",
          .options = {{.name = "--json", .help = "one JSON document on standard output instead of text"},
                      {.name = "--follow",
                       .help = "a line of JSON for each unit as soon as it is judged and recorded, the lot's document "
                               "as the last line"},
                      {.name = "--report",
                       .kind = ValueKind::file,
                       .value_name = "FILE",
                       .help = "writes the report of the lot as one self-contained page, .html or .pdf",
                       .example = "lot.html"}}};
}

}  // namespace

Command inspect_command() {
  return {
      .name = "inspect",
      .summary = "a verdict for each unit of a lot, and a decision on it",
      .description =
          "The part sheet says what the part must be, at which conditions, by which rule it is judged and how many units "
          "decide; the folder holds the captures, SERIAL.TEST.ENDING each (0017.ringdown.csv), or a lot.toml that lists "
          "them. Every unit is measured and judged, then the lot.\n"
          "Exit code: 0 accepted, 1 rejected, 3 undecided.",
      .positional = {.name = "PART.toml FOLDER",
                     .help = "the part sheet, and the folder of the lot (none with --check-sheet)",
                     .least = 1,
                     .most = 2},
      .groups = {lot_options(), lot_output_options(), measuring_options()},
      .examples = {{"inspect drum.toml lot-0412", "text; nothing is recorded"},
                   {"inspect drum.toml lot-0412 --ledger drum.ledger --report 0412.pdf",
                    "verdicts go to the ledger, the report is signed on paper"},
                   {"inspect drum.toml lot-0412 --lot-size 500 --json", "the units present are a sample of 500"},
                   {"inspect --check-sheet drum.toml", "what the sheet demands, and what in it cannot work"}},
      .run = run};
}

}  // namespace coilassay

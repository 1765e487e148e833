// coilassay ledger list, show, verify, export, correct
#include <ostream>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/ledger_run.h"
#include "app/runs/measure_again.h"
#include "base/outside_text.h"
#include "report/ledger_csv.h"
#include "report/ledger_json.h"
#include "report/ledger_text.h"

namespace coilassay {

namespace {

EntryQuery query_of(const Arguments& arguments) {
  EntryQuery query;
  if (const auto kind = arguments.text("--kind")) query.kind = entry_kind(*kind);
  query.lot = arguments.text("--lot");
  query.serial = arguments.text("--serial");
  query.supplier = arguments.text("--supplier");
  if (const auto newest = arguments.count("--newest")) query.newest = *newest;
  return query;
}

/// What was found, with where the chain ends.
struct Found {
  std::vector<Entry> entries;
  std::string part;
  LedgerHead head;
};

/// A ledger to be shown: a damaged one would show what is left of it as if it were all.
Result<Ledger> sound_ledger(const Arguments& arguments) {
  const std::string& file = arguments.words().front();
  Result<Ledger> ledger = Ledger::open({.path = file});
  if (!ledger) return ledger;
  const Result<LedgerCheck> check = ledger->verify(nullptr);
  if (!check) return failure(check);
  if (check->holds()) return ledger;
  return failure(Problem::ledger, file, "the ledger is not what was written: " + check->faults.front().what,
                 "coilassay ledger verify names all of it; go on from a copy that holds");
}

Result<Found> find_entries(const Arguments& arguments) {
  const Result<Ledger> ledger = sound_ledger(arguments);
  if (!ledger) return failure(ledger);
  Found found;
  Result<std::vector<Entry>> entries = ledger->find(query_of(arguments));
  if (!entries) return failure(entries);
  found.entries = std::move(*entries);
  Result<std::string> part = ledger->part();
  if (!part) return failure(part);
  found.part = std::move(*part);
  Result<LedgerHead> head = ledger->head();
  if (!head) return failure(head);
  found.head = std::move(*head);
  return found;
}

Result<ExitCode> run_list(const Arguments& arguments, Console& console) {
  const Result<Found> found = find_entries(arguments);
  if (!found) return failure(found);
  console.out() << (arguments.has("--json") ? ledger_json(found->entries, found->part, found->head)
                                            : list_text(found->entries, arguments.words().front(), found->head, console.out_style()));
  return ExitCode::done;
}

Result<ExitCode> run_export(const Arguments& arguments, Console& console) {
  const std::string target = arguments.text("-o").value_or("-");
  const bool csv = arguments.has("--csv"), json = arguments.has("--json");
  if (csv && json) return failure(Problem::usage, "--csv", "--json was given as well", "give one of them");
  const Result<Found> found = find_entries(arguments);
  if (!found) return failure(found);
  const std::string text = csv || (!json && target.ends_with(".csv")) ? ledger_csv(found->entries) : ledger_json(found->entries, found->part, found->head);
  if (const Result<void> written = console.write(target, text); !written) return failure(written);
  if (target != "-" && !arguments.has("--quiet")) {
    console.say(shown(target) + ": " + std::to_string(found->entries.size()) + (found->entries.size() == 1 ? " entry" : " entries"));
  }
  return ExitCode::done;
}

Result<ExitCode> run_show(const Arguments& arguments, Console& console) {
  const Result<std::int64_t> id = entry_number(arguments.words()[1]);
  if (!id) return failure(id);
  const Result<Ledger> ledger = sound_ledger(arguments);
  if (!ledger) return failure(ledger);
  const Result<Entry> entry = ledger->entry(*id);
  if (!entry) return failure(entry);
  const Result<std::vector<Entry>> corrections = ledger->corrections_of(*id);
  if (!corrections) return failure(corrections);
  std::optional<MeasuredAgain> again;
  const AgainJob job{arguments.text("--sheet"), arguments.text("--folder")};
  if (arguments.has("--again")) {
    RunSession session(arguments, console, arguments.has("--quiet"));
    Result<MeasuredAgain> measured = measure_again(entry->content, job, session.context());
    session.end_progress();
    if (!measured) return failure(measured);
    again = std::move(*measured);
  } else if (job.sheet || job.folder) {
    return failure(Problem::usage, job.sheet ? "--sheet" : "--folder", "nothing is measured without --again", "add --again, or leave it out");
  }
  if (arguments.has("--json")) {
    std::vector<Entry> all{*entry};
    all.insert(all.end(), corrections->begin(), corrections->end());
    const Result<LedgerHead> head = ledger->head();
    if (!head) return failure(head);
    console.out() << ledger_json(all, entry->content.part, *head, again);
  } else {
    console.out() << entry_text(*entry, *corrections, console.out_style());
    if (again) console.out() << again_text(*again, console.out_style());
  }
  return again && !again->same() ? ExitCode::rejected : ExitCode::done;
}

Result<ExitCode> run_verify(const Arguments& arguments, Console& console) {
  const std::string& file = arguments.words().front();
  RunSession session(arguments, console, arguments.has("--quiet"));
  const Result<LedgerVerification> done = verify_ledger(file, arguments.text("--head"), session.context());
  session.end_progress();
  if (!done) return failure(done);
  console.out() << (arguments.has("--json") ? verify_json(done->check, file, done->expected)
                                            : verify_text(done->check, file, done->expected, console.out_style()));
  return holds(done->check, done->expected) ? ExitCode::done : ExitCode::broken;
}

Result<ExitCode> run_correct(const Arguments& arguments, Console& console) {
  const Result<std::int64_t> id = entry_number(arguments.words()[1]);
  if (!id) return failure(id);
  CorrectionJob job{.id = *id,
                    .reason = arguments.text("--reason").value_or(""),
                    .serial = arguments.text("--serial"),
                    .lot = arguments.text("--lot"),
                    .supplier = arguments.text("--supplier"),
                    .verdict = arguments.text("--verdict"),
                    .operator_name = arguments.text("--operator").value_or("")};
  RunContext context;
  context.now = console.now();
  const Result<Entry> stored = correct_entry(arguments.words().front(), job, context);
  if (!stored) return failure(stored);
  if (arguments.has("--json")) {
    console.out() << ledger_json(std::span(&*stored, 1), stored->content.part, LedgerHead{stored->id, stored->hash});
  } else {
    console.out() << entry_text(*stored, {}, console.out_style());
  }
  return ExitCode::done;
}

Option json_option() { return {.name = "--json", .help = "one JSON document on standard output instead of text"}; }

OptionGroup choice_of_entries() {
  return {.title = "Which entries",
          .options = {{.name = "--lot", .kind = ValueKind::text, .value_name = "NAME", .help = "only those of this lot", .example = "0412"},
                      {.name = "--serial", .kind = ValueKind::text, .value_name = "NAME", .help = "only those of this unit or check standard", .example = "0017"},
                      {.name = "--supplier", .kind = ValueKind::text, .value_name = "NAME", .help = "only those of this supplier", .example = "Reel Hall"},
                      {.name = "--kind", .kind = ValueKind::choice, .value_name = "KIND", .help = "only those of this kind", .example = "lot",
                       .choices = {"unit", "lot", "check", "correction"}},
                      {.name = "--newest", .kind = ValueKind::count, .value_name = "N", .help = "only the newest of them", .example = "20", .least = 1, .most = 1000000000}}};
}

Positional one_file() { return {.name = "FILE", .help = "the ledger", .least = 1, .most = 1}; }
Positional file_and_id() { return {.name = "FILE ID", .help = "the ledger, and the number of an entry", .least = 2, .most = 2}; }

}  // namespace

Command ledger_list_command() {
  return {.name = "ledger list",
          .summary = "what was recorded, one line an entry",
          .description =
              "Entries as they were recorded, oldest first; an entry that was corrected says by which one. The head at the end is "
              "the hash of the last entry: it stands in reports, so that a ledger whose end was cut off shows.",
          .positional = one_file(),
          .groups = {choice_of_entries(), {.title = "Output", .options = {json_option()}}, everywhere_options()},
          .examples = {{"ledger list drum-47.ledger --lot 0412", "every entry of a lot"},
                       {"ledger list drum-47.ledger --serial 0017 --json", "the whole story of a unit, for programs"}},
          .run = run_list};
}

Command ledger_show_command() {
  return {.name = "ledger show",
          .summary = "one entry; --again measures it again from its files",
          .description =
              "Everything an entry says, the corrections that point to it, and its place in the chain.\n"
              "With --again the unit is measured and judged again from its raw captures by the part sheet of then, and every digit "
              "that comes out otherwise is listed: exit code 0 when there is none, 1 when there are some. Captures and sheet must "
              "have the digests that were recorded.",
          .positional = file_and_id(),
          .groups = {{.title = "Measuring again",
                      .options = {{.name = "--again", .help = "measures again from the raw files and compares"},
                                  {.name = "--folder", .kind = ValueKind::file, .value_name = "FOLDER",
                                   .help = "where the captures are now, unless where they were", .example = "archive/0412"},
                                  {.name = "--sheet", .kind = ValueKind::file, .value_name = "FILE.toml",
                                   .help = "where the part sheet is now, unless where it was", .example = "archive/drum-47.toml"}}},
                     {.title = "Output", .options = {json_option()}}, everywhere_options()},
          .examples = {{"ledger show drum-47.ledger 17", "entry 17"},
                       {"ledger show drum-47.ledger 17 --again", "does it still come out so?"}},
          .run = run_show};
}

Command ledger_verify_command() {
  return {.name = "ledger verify",
          .summary = "whether a ledger is what was written",
          .description =
              "Reads everything: that each entry follows the one before it and has its hash, that the columns and the list of files say "
              "what the recorded text says, that the rules against changing are in place, and the structure of the file. Exit code 0 "
              "when all holds, 4 when it does not.\n"
              "A chain cannot know what came after its end: give the head that a report printed to see whether entries are missing "
              "there.",
          .positional = one_file(),
          .groups = {{.title = "Checking",
                      .options = {{.name = "--head", .kind = ValueKind::text, .value_name = "HASH",
                                   .help = "must be in the chain: the head of a report, or its first 8 digits at least",
                                   .example = "3fa94c01"}}},
                     {.title = "Output", .options = {json_option()}}, everywhere_options()},
          .examples = {{"ledger verify drum-47.ledger", "exit code 0 when the chain holds"},
                       {"ledger verify drum-47.ledger --head 3fa94c01", "also that the entry of a report is still in it"}},
          .run = run_verify};
}

Command ledger_export_command() {
  return {.name = "ledger export",
          .summary = "a ledger as JSON, or as a table for spreadsheets",
          .description =
              "JSON has every entry whole, with the exact text its hash was made of. CSV has one row an entry, with value, U, min, max and "
              "verdict of each limited quantity in SI units; a cell that a spreadsheet would take for a formula begins with an "
              "apostrophe.",
          .positional = one_file(),
          .groups = {choice_of_entries(),
                     {.title = "Output",
                      .options = {{.name = "--json", .help = "as JSON: what is done unless the name after -o ends in .csv"},
                                  {.name = "--csv", .help = "as a table for spreadsheets"},
                                  {.name = "-o", .kind = ValueKind::file, .value_name = "FILE", .help = "where to; standard output unless given",
                                   .example = "drum-47.csv"}}},
                     everywhere_options()},
          .examples = {{"ledger export drum-47.ledger -o drum-47.csv", "everything, for a spreadsheet"},
                       {"ledger export drum-47.ledger --lot 0412 -o lot.json", "a lot, for another program"}},
          .run = run_export};
}

Command ledger_correct_command() {
  return {.name = "ledger correct",
          .summary = "adds what an entry should have said; that one stays",
          .description =
              "Nothing in a ledger is changed. A correction is an entry of its own that points back, with its reason; the newest one "
              "counts. What is not given stays as it stands today; with a reason alone it is a remark.",
          .positional = file_and_id(),
          .groups = {{.title = "Correction",
                      .options = {{.name = "--reason", .kind = ValueKind::text, .value_name = "TEXT", .help = "why; must be given",
                                   .example = "serial was mistyped"},
                                  {.name = "--serial", .kind = ValueKind::text, .value_name = "NAME", .help = "the serial it should have", .example = "0018"},
                                  {.name = "--lot", .kind = ValueKind::text, .value_name = "NAME", .help = "the lot it belongs to", .example = "0413"},
                                  {.name = "--supplier", .kind = ValueKind::text, .value_name = "NAME", .help = "who delivered it", .example = "Reel Hall"},
                                  {.name = "--verdict", .kind = ValueKind::text, .value_name = "VERDICT",
                                   .help = "of a unit pass, fail, undecided or not_comparable; of a lot accept, reject or undecided",
                                   .example = "undecided"},
                                  {.name = "--operator", .kind = ValueKind::text, .value_name = "NAME", .help = "who says so", .example = "J. Marsh"}}},
                     {.title = "Output", .options = {json_option()}}, everywhere_options()},
          .examples = {{"ledger correct drum-47.ledger 17 --serial 0018 --reason mistyped", "gives a unit its real serial"},
                       {"ledger correct drum-47.ledger 17 --reason cracked", "adds a remark"}},
          .run = run_correct};
}

}  // namespace coilassay

#include "app/runs/ledger_run.h"

#include <algorithm>
#include <charconv>

#include "app/runs/version.h"
#include "base/outside_text.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

constexpr std::size_t kLeastDigits = 8;  // of a hash that is copied by hand

bool is_hash(std::string_view text) {
  return text.size() >= kLeastDigits && text.size() <= 64 && std::all_of(text.begin(), text.end(), [](char c) {
           return (c >= '0' && c <= '9') || (c >= 'a' && c <= 'f');
         });
}

/// The verdicts an entry of this kind can have.
std::vector<std::string_view> verdicts_of(EntryKind kind) {
  switch (kind) {
    case EntryKind::unit: return {"pass", "fail", "undecided", "not_comparable"};
    case EntryKind::lot: return {"accept", "reject", "undecided"};
    default: return {};
  }
}

Result<void> check_job(const CorrectionJob& job, const EntryContent& about) {
  if (job.reason.empty()) {
    return failure(Problem::usage, "--reason", "a correction needs a reason", "say why, as in --reason \"serial was mistyped\"");
  }
  if (job.serial && about.kind == EntryKind::lot) {
    return failure(Problem::usage, "--serial", "entry " + std::to_string(job.id) + " is about a lot, which has no serial",
                   "leave it out");
  }
  if (job.lot && about.kind == EntryKind::check) {
    return failure(Problem::usage, "--lot", "entry " + std::to_string(job.id) + " is about a check standard, which is of no lot",
                   "leave it out");
  }
  if (!job.verdict) return {};
  const auto known = verdicts_of(about.kind);
  if (std::find(known.begin(), known.end(), *job.verdict) != known.end()) return {};
  std::string words;
  for (const std::string_view each : known) words += (words.empty() ? "" : ", ") + std::string(each);
  return failure(Problem::usage, "--verdict", "an entry of kind '" + std::string(name(about.kind)) + "' cannot be '" + *job.verdict + "'",
                 words.empty() ? "leave it out" : "one of " + words);
}

}  // namespace

Result<LedgerVerification> verify_ledger(const std::string& path, const std::optional<std::string>& expected_head,
                                         const RunContext& context) {
  if (expected_head && !is_hash(*expected_head)) {
    return failure(Problem::usage, "--head", "'" + shown(*expected_head, 80) + "' is no hash",
                   "copy it from a report: 64 hexadecimal digits, or at least the first 8 of them");
  }
  const Result<Ledger> ledger = Ledger::open({.path = path});
  if (!ledger) return failure(ledger);
  Result<LedgerCheck> check = ledger->verify(context.progress);
  if (!check) return failure(check);
  LedgerVerification done{std::move(*check), {}};
  if (!expected_head) return done;
  done.expected = ExpectedHead{*expected_head, {}};
  if (std::string(kFirstPrevious).starts_with(*expected_head)) done.expected->id = 0;  // of a ledger without entries
  if (!done.check.holds()) return done;
  const Result<std::optional<Entry>> entry = ledger->entry_of_hash(*expected_head);
  if (!entry) return failure(entry);
  if (*entry) done.expected->id = (*entry)->id;
  return done;
}

Result<std::int64_t> entry_number(const std::string& typed) {
  std::int64_t id = 0;
  const auto [end, code] = std::from_chars(typed.data(), typed.data() + typed.size(), id);
  if (code != std::errc() || end != typed.data() + typed.size() || id < 1) {
    return failure(Problem::usage, "ID", "'" + shown(typed, 40) + "' is no number of an entry", "coilassay ledger list FILE shows them");
  }
  return id;
}

Result<Entry> correct_entry(const std::string& path, const CorrectionJob& job, const RunContext& context) {
  Result<Ledger> ledger = Ledger::open({.path = path, .mode = LedgerMode::append});
  if (!ledger) return failure(ledger);
  const Result<Entry> about = ledger->entry(job.id);
  if (!about) return failure(about);
  if (const Result<void> fine = check_job(job, about->content); !fine) return failure(fine);
  const Result<std::vector<Entry>> before = ledger->corrections_of(job.id);
  if (!before) return failure(before);

  // What stands today, with what is to change.
  EntryContent content = before->empty() ? about->content : before->back().content;
  content.kind = EntryKind::correction;
  content.time = context.now;
  content.corrects = job.id;
  content.reason = json_safe(job.reason);
  content.operator_name = json_safe(job.operator_name);
  content.program = program_name();
  content.instrument.clear();
  content.sources.clear();
  content.details.clear();
  if (job.serial) content.serial = json_safe(*job.serial);
  if (job.lot) content.lot = json_safe(*job.lot);
  if (job.supplier) content.supplier = json_safe(*job.supplier);
  if (job.verdict) content.verdict = *job.verdict;
  return ledger->append(content);
}

}  // namespace coilassay

#include "app/runs/lot_past.h"

#include <algorithm>
#include <set>

#include "base/outside_text.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using Digests = std::multiset<std::string>;

Digests digests_of(const EntryContent& entry) {
  Digests digests;
  for (const EntrySource& source : entry.sources) digests.insert(source.sha256);
  return digests;
}

/// Of the captures the tests use; a file that cannot be read has none, here as in its entry.
Digests digests_of(const LotUnit& unit, const std::vector<PreparedTest>& tests) {
  Digests digests;
  for (const PreparedTest& test : tests) {
    const UnitCaptures* captures = unit.find(test.plan.name);
    if (captures == nullptr) continue;
    for (const std::string& file : captures->files) {
      if (const Result<std::string> digest = digest_of_file(file)) digests.insert(*digest);
    }
  }
  return digests;
}

}  // namespace

Result<UnitPast> past_of_unit(const Ledger& ledger, const PartSheet& sheet, const std::string& lot, const LotUnit& unit,
                              const std::vector<PreparedTest>& tests) {
  UnitPast past;
  const Result<std::vector<Entry>> entries = ledger.units(json_safe(unit.serial), json_safe(lot));
  if (!entries) return failure(entries);
  if (entries->empty()) return past;
  const Digests here = digests_of(unit, tests);
  for (const Entry& entry : *entries) {
    past.last_attempt = std::max(past.last_attempt, static_cast<std::uint64_t>(std::max(entry.content.attempt, 0)));
    past.newest = entry;
    const bool same = digests_of(entry.content) == here;
    if (entry.content.sheet_sha256 != sheet.sha256) {
      past.other_sheet = past.other_sheet || same;
      continue;
    }
    Result<UnitVerdict> verdict = verdict_of_entry(entry.content, sheet);
    if (!verdict) return failure(verdict);
    verdict->serial = unit.serial;
    past.attempts.push_back(std::move(*verdict));
    past.entries.push_back(entry);
    past.recorded = past.recorded || same;
  }
  return past;
}

Result<std::string> reason_for(const UnitPast& past, const LotUnit& unit, const std::optional<std::string>& stated) {
  if (!past.newest) return std::string();
  if (unit.reason) return *unit.reason;
  if (stated) return *stated;
  if (past.other_sheet) return std::string("the part sheet has changed");
  const EntryContent& before = past.newest->content;
  return failure(Problem::usage, "unit " + shown(unit.serial, 60),
                 "it was inspected before from another capture (entry " + std::to_string(past.newest->id) + ", attempt " +
                     std::to_string(before.attempt) + ", " + before.verdict + "), and a new attempt needs a reason",
                 "say why with --reason TEXT, or put the capture of that attempt back");
}

Result<std::vector<LotHistory>> lots_before(const Ledger& ledger, const PartSheet& sheet, const std::string& lot) {
  const Result<std::vector<Entry>> own = ledger.units_of_lot(json_safe(lot));
  if (!own) return failure(own);
  const Result<std::vector<Entry>> decisions = ledger.lots(json_safe(sheet.supplier));
  if (!decisions) return failure(decisions);
  std::vector<LotHistory> history;
  std::set<std::string> seen;
  for (const Entry& entry : *decisions) {
    // A lot that is taken up again is judged as severely as it was begun.
    if (entry.content.lot == json_safe(lot) || (!own->empty() && entry.id > own->front().id)) continue;
    Result<LotHistory> decided = lot_history_of(entry.content);
    if (!decided) return failure(decided);
    if (decided->decision == LotResult::undecided || !seen.insert(entry.content.lot).second) continue;
    history.push_back(*decided);
  }
  return history;
}

Result<StoredDecision> store_decision(Ledger& ledger, const LotOutcome& outcome, const InspectionSetting& setting) {
  const EntryContent content = lot_entry(outcome, setting);
  const Result<std::vector<Entry>> decisions = ledger.lots(json_safe(setting.sheet->supplier));
  if (!decisions) return failure(decisions);
  std::vector<Entry> own;
  std::copy_if(decisions->begin(), decisions->end(), std::back_inserter(own),
               [&](const Entry& e) { return e.content.lot == content.lot; });
  const auto before = [&own](std::size_t count) {
    return count == 0 ? std::nullopt : std::optional(own[count - 1].id);
  };
  if (!own.empty() && own.back().content.verdict == content.verdict &&
      own.back().content.sheet_sha256 == content.sheet_sha256 && own.back().content.details == content.details) {
    return StoredDecision{own.back(), before(own.size() - 1)};
  }
  Result<Entry> stored = ledger.append(content);
  if (!stored) return failure(stored);
  return StoredDecision{std::move(*stored), before(own.size())};
}

Result<std::vector<Finding>> serials_of_other_lots(const Ledger& ledger, const std::string& lot,
                                                   const std::vector<LotUnit>& units) {
  std::vector<Finding> findings;
  for (const LotUnit& unit : units) {
    const Result<std::vector<Entry>> entries = ledger.units(json_safe(unit.serial));
    if (!entries) return failure(entries);
    for (const Entry& entry : *entries) {
      if (entry.content.lot == json_safe(lot)) continue;
      findings.push_back({"duplicate_serial", Severity::caution,
                          "unit " + shown(unit.serial, 60) + " was inspected in lot " + shown(entry.content.lot, 60) +
                              " as well (entry " + std::to_string(entry.id) + ", " + entry.content.verdict +
                              "): look whether one of the serials is mistyped",
                          unit.serial, static_cast<double>(entry.id), Unit::one});
      break;
    }
  }
  return findings;
}

}  // namespace coilassay

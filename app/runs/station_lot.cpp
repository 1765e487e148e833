#include "app/runs/station_lot.h"

#include <algorithm>

#include "app/runs/lot_close.h"
#include "app/runs/version.h"
#include "base/outside_text.h"
#include "report/json_writer.h"

namespace coilassay {

InspectionSetting StationLot::setting(UtcTime now, const std::string& instrument) const {
  return {&sheet_, lot_, operator_, instrument, program_name(), now};
}

Result<StationLot> StationLot::open(const StationJob& job, PartSheet sheet, UtcTime) {
  auto ledger = Ledger::open({.path = job.ledger, .mode = LedgerMode::create, .part = json_safe(sheet.name)});
  if (!ledger) return failure(ledger);
  StationLot lot(std::move(*ledger), std::move(sheet));
  lot.ledger_path_ = job.ledger;
  lot.lot_ = job.lot;
  lot.operator_ = job.operator_name;
  lot.lot_size_ = job.lot_size;
  auto history = lots_before(lot.ledger_, lot.sheet_, lot.lot_);
  if (!history) return failure(history);
  lot.history_ = std::move(*history);
  lot.severity_ = next_severity(lot.sheet_.sampling, lot.history_);
  if (job.lot_size && lot.severity_.severity != Severity105::discontinued) {
    auto plan = plan_for(lot.sheet_.sampling, *job.lot_size, lot.severity_.severity);
    if (!plan) return failure(plan);
    lot.plan_ = std::move(*plan);
  }
  const auto entries = lot.ledger_.units_of_lot(json_safe(lot.lot_));
  if (!entries) return failure(entries);
  for (const Entry& entry : *entries) {
    const std::string& serial = entry.content.serial;
    Known& unit = lot.units_[serial];
    unit.last_attempt = std::max(unit.last_attempt, static_cast<std::uint64_t>(std::max(entry.content.attempt, 0)));
    // By another sheet: measured before, but nothing of it counts for this one.
    if (entry.content.sheet_sha256 != lot.sheet_.sha256) continue;
    auto verdict = verdict_of_entry(entry.content, lot.sheet_);
    if (!verdict) return failure(verdict);
    if (unit.attempts.empty()) lot.order_.push_back(serial);
    unit.attempts.push_back(std::move(*verdict));
    unit.entry = entry.id;
    unit.from_ledger = true;
    unit.sources = entry.content.sources;
  }
  if (job.lot_size && lot.order_.size() > *job.lot_size) {
    return failure(Problem::usage, "--lot-size",
                   std::to_string(lot.order_.size()) + " units of the lot are in the ledger, more than a lot of " + std::to_string(*job.lot_size),
                   "give the number of units of the whole lot, measured or not");
  }
  return lot;
}

const StationLot::Known* StationLot::find(const std::string& serial) const {
  const auto found = units_.find(json_safe(serial));
  return found == units_.end() || found->second.attempts.empty() ? nullptr : &found->second;
}

std::uint64_t StationLot::counted(const std::string& serial) const {
  const Known* unit = find(serial);
  return unit == nullptr ? 0 : standing(sheet_, unit->attempts).counted;
}

UnitVerdict StationLot::standing_of(const std::string& serial) const { return standing(sheet_, find(serial)->attempts).verdict; }

void StationLot::tell_cautions(const std::vector<TestRun>& runs) {
  for (const TestRun& run : runs) {
    for (const Caution& caution : run.measurement.cautions) {
      const auto same = std::find_if(cautions_.begin(), cautions_.end(), [&](const Caution& c) { return c.code == caution.code; });
      if (same == cautions_.end()) cautions_.push_back(caution);
      else if (caution.figure > same->figure) *same = caution;
    }
  }
}

Result<UnitVerdict> StationLot::store(const std::string& serial, const std::vector<TestRun>& runs, const std::string& reason, UtcTime now,
                                      const std::string& instrument) {
  const auto known = units_.find(json_safe(serial));
  const std::uint64_t attempt = known == units_.end() ? 1 : known->second.last_attempt + 1;
  std::vector<TestedUnit> tested;
  for (const TestRun& run : runs) tested.push_back({run.test, run.measurement});
  UnitRun unit{judge_unit(sheet_, serial, attempt, tested), runs, reason};
  if (attempt > 1 && reason.empty()) unit.reason = "the part sheet has changed";
  const auto stored = ledger_.append(unit_entry(unit, setting(now, instrument)));
  if (!stored) return failure(stored);
  Known& kept = units_[json_safe(serial)];
  if (kept.attempts.empty()) order_.push_back(json_safe(serial));
  kept.attempts.push_back(unit.verdict);
  kept.last_attempt = attempt;
  kept.entry = stored->id;
  kept.from_ledger = false;
  kept.sources = stored->content.sources;
  tell_cautions(runs);
  for (const TestRun& run : runs) {
    auto test = std::find_if(tests_.begin(), tests_.end(), [&](const LotTestRecord& each) { return each.test == run.test; });
    if (test == tests_.end()) test = tests_.insert(tests_.end(), {run.test, run.kind, std::nullopt, "", run.measurement.equipment, std::nullopt, std::nullopt, ""});
    if (test->example || run.measurement.estimates.empty()) continue;
    test->example = run.measurement;
    test->example_serial = serial;
  }
  return unit.verdict;
}

Result<void> StationLot::set_aside(const std::string& serial, UtcTime now, const std::string& instrument) {
  Known& unit = units_.at(json_safe(serial));
  EntryContent correction;
  correction.kind = EntryKind::correction;
  correction.time = now;
  correction.part = json_safe(sheet_.name);
  correction.revision = json_safe(sheet_.revision);
  correction.supplier = json_safe(sheet_.supplier);
  correction.sheet_sha256 = sheet_.sha256;
  correction.lot = json_safe(lot_);
  correction.serial = json_safe(serial);
  correction.verdict = name(Verdict::undecided);
  correction.operator_name = json_safe(operator_);
  correction.instrument = json_safe(instrument);
  correction.program = program_name();
  correction.corrects = unit.entry;
  correction.reason = "set aside at the station";
  if (const auto stored = ledger_.append(correction); !stored) return failure(stored);
  unit.attempts.back().verdict = Verdict::undecided;
  return {};
}

Result<void> StationLot::store_check(const Estimate& value, const std::vector<TestRun>& runs, UtcTime now, const std::string& instrument) {
  const auto stored = ledger_.append(check_entry(value, runs, setting(now, instrument)));
  if (!stored) return failure(stored);
  return {};
}

Result<CheckStatus> StationLot::check_state(UtcTime now, CheckChart* chart) const {
  const CheckStandard& standard = *sheet_.check_standard;
  const auto entries = ledger_.checks(json_safe(standard.serial));
  if (!entries) return failure(entries);
  std::vector<CheckReading> readings;
  for (const Entry& entry : *entries) {
    const auto reading = check_reading_of(entry.content);
    if (!reading) return failure(reading);
    readings.push_back(*reading);
  }
  const CheckChart all = check_chart(standard, std::move(readings));
  if (chart != nullptr) *chart = all;
  return check_status(standard, all, now);
}

Result<std::optional<std::string>> StationLot::other_lot_of(const std::string& serial) const {
  const auto entries = ledger_.units(json_safe(serial));
  if (!entries) return failure(entries);
  for (const Entry& entry : *entries) {
    if (entry.content.lot != json_safe(lot_)) return entry.content.lot;
  }
  return std::nullopt;
}

StationProgress StationLot::progress() const {
  StationProgress progress;
  progress.part = sheet_.name;
  progress.lot = lot_;
  for (const std::string& serial : order_) {
    const Known& unit = units_.at(serial);
    ++progress.units;
    if (unit.attempts.front().verdict == Verdict::pass) ++progress.first_pass;
    const Verdict verdict = standing(sheet_, unit.attempts).verdict.verdict;
    if (verdict == Verdict::pass) ++progress.standing_pass;
    if (verdict == Verdict::fail) ++progress.standing_fail;
  }
  if (plan_) {
    progress.n = plan_->n;
    if (plan_->scheme != SamplingScheme::variables) progress.accept = plan_->accept;
  }
  return progress;
}

Result<LotRecord> StationLot::close(const std::string& instrument, const std::vector<EquipmentItem>& equipment, std::vector<Finding> findings,
                                    UtcTime now) {
  LotRecord record;
  record.program = program_name();
  record.when = now;
  record.operator_name = operator_;
  record.sheet = sheet_;
  record.lot = lot_;
  record.severity_why = severity_.why;
  record.findings = std::move(findings);
  record.cautions = cautions_;
  record.tests = tests_;
  if (record.tests.empty()) record.tests.push_back({"reading", "reading", std::nullopt, "", equipment, std::nullopt, std::nullopt, ""});
  record.tests.front().equipment = equipment;
  record.lot_size = std::max<std::uint64_t>(lot_size_.value_or(0), order_.size());
  for (const std::string& serial : order_) {
    const Known& unit = units_.at(serial);
    const StandingVerdict stands = standing(sheet_, unit.attempts);
    LotUnitRecord kept;
    kept.verdict = stands.verdict;
    kept.made = stands.made;
    kept.counted = stands.counted;
    kept.from_ledger = unit.from_ledger;
    kept.entry = unit.entry;
    for (const EntrySource& each : unit.sources) kept.files.push_back({each.test, each.file, each.sha256});
    record.units.push_back(std::move(kept));
    const auto other = other_lot_of(serial);
    if (!other) return failure(other);
    if (*other) {
      record.findings.push_back({"duplicate_serial", Severity::caution,
                                 "unit " + shown(serial, 60) + " was inspected in lot " + shown(**other, 60) +
                                     " as well: look whether one of the serials is mistyped",
                                 serial, 0, Unit::one});
    }
  }
  if (sheet_.check_standard) {
    CheckChart chart;
    auto state = check_state(now, &chart);
    if (!state) return failure(state);
    record.check = *state;
    record.check_chart = std::move(chart);
  }
  if (severity_.severity == Severity105::discontinued || record.lot_size == 0) {
    record.decision.why = record.lot_size == 0 ? "no unit was measured" : "inspection of this part from this supplier is discontinued: " + severity_.why;
    const auto head = ledger_.head();
    if (!head) return failure(head);
    record.ledger = LotLedger{ledger_path_, 0, 0, head->hash, std::nullopt, std::nullopt};
    return record;
  }
  auto plan = plan_for(sheet_.sampling, record.lot_size, severity_.severity);
  if (!plan) return failure(plan);
  record.plan = std::move(*plan);
  if (auto closed = close_lot(record, history_, &ledger_, ledger_path_, setting(now, instrument)); !closed) return failure(closed);
  return record;
}

}  // namespace coilassay

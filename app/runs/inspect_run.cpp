#include "app/runs/inspect_run.h"

#include <algorithm>
#include <chrono>
#include <map>
#include <set>

#include "app/runs/check_run.h"
#include "app/runs/lot_close.h"
#include "app/runs/lot_folder.h"
#include "app/runs/lot_past.h"
#include "app/runs/spared_files.h"
#include "app/runs/unit_tests.h"
#include "app/runs/version.h"
#include "base/outside_text.h"
#include "base/parallel.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

/// A run of the command, step by step.
class Inspection {
 public:
  Inspection(const InspectJob& job, const RunContext& context, const UnitFollower& follow)
      : job_(job), context_(context), follow_(follow) {}

  Result<LotRecord> run();

 private:
  struct InspectedUnit {
    UnitPast past;
    std::string reason;
    std::vector<TestRun> runs;   // of this run; empty when the entry stands
    UnitVerdict attempt;         // the newest
  };

  Result<void> read_everything();
  Result<void> spare_what_is_read() const;
  Result<void> look_back();
  Result<bool> may_begin();
  Result<void> measure_all();
  Result<void> measure_batch(std::size_t first, std::size_t end);
  Result<void> refuse_captures_of_others(InspectedUnit& unit, const std::string& serial) const;
  Result<std::vector<std::optional<std::int64_t>>> store(const std::vector<std::size_t>& fresh);
  void keep(std::size_t index, std::optional<std::int64_t> entry);
  void tell_of_tests();
  void tell_cautions(const std::vector<Caution>& cautions);
  void keep_figures();

  const InspectJob& job_;
  const RunContext& context_;
  const UnitFollower& follow_;
  LotRecord record_;
  LotFolder folder_;
  std::vector<PreparedTest> tests_;
  std::optional<LotUnit> check_captures_;
  std::optional<Ledger> ledger_;
  std::vector<LotHistory> history_;
  std::vector<InspectedUnit> units_;
  InspectionSetting setting_;
};

/// Captures nobody asked for, by test.
void tell_unused(LotRecord& record, const LotFolder& folder, const std::vector<PreparedTest>& tests) {
  std::map<std::string, std::size_t> unused;
  for (const LotUnit& unit : folder.units) {
    for (const UnitCaptures& captures : unit.tests) {
      const bool used = std::any_of(tests.begin(), tests.end(),
                                    [&](const PreparedTest& test) { return test.plan.name == captures.test; });
      if (!used) unused[captures.test] += captures.files.size();
    }
  }
  for (const auto& [test, count] : unused) {
    record.findings.push_back({"unused_captures", Severity::note,
                               std::to_string(count) + (count == 1 ? " capture of the test " : " captures of the test ") +
                                   test + (count == 1 ? " was" : " were") +
                                   " not measured: no limit of the sheet is judged by it",
                               test, static_cast<double>(count), Unit::one});
  }
}

Result<void> Inspection::read_everything() {
  Result<PartSheet> sheet = read_part_sheet(job_.sheet);
  if (!sheet) return failure(sheet);
  record_.sheet = std::move(*sheet);
  Result<std::vector<PreparedTest>> tests = prepare_tests(record_.sheet);
  if (!tests) return failure(tests);
  tests_ = std::move(*tests);

  const std::vector<std::string> names = capture_tests(record_.sheet);
  const std::vector<std::string_view> known(names.begin(), names.end());
  Result<LotFolder> folder = read_lot_folder(job_.folder, known);
  if (!folder) return failure(folder);
  folder_ = std::move(*folder);
  if (const auto found = find_same_captures(folder_); !found) return failure(found);

  if (const auto& standard = record_.sheet.check_standard) {
    const auto its = std::find_if(folder_.units.begin(), folder_.units.end(),
                                  [&](const LotUnit& unit) { return unit.serial == standard->serial; });
    if (its != folder_.units.end()) {
      check_captures_ = std::move(*its);
      folder_.units.erase(its);
    }
  }
  if (folder_.units.empty()) {
    return failure(Problem::unreadable, job_.folder, "there is no unit of the lot in it, only the check standard",
                   "name the captures SERIAL.TEST.ENDING, as in 0017.ringdown.csv");
  }
  if (auto spared = spare_what_is_read(); !spared) return spared;
  record_.program = program_name();
  record_.when = context_.now;
  record_.operator_name = job_.operator_name;
  record_.folder = job_.folder;
  record_.lot = job_.lot.value_or(folder_.name);
  record_.findings = folder_.findings;
  tell_unused(record_, folder_, tests_);
  record_.lot_size = job_.lot_size.value_or(folder_.units.size());
  if (record_.lot_size < folder_.units.size()) {
    return failure(Problem::usage, "--lot-size",
                   "there are " + std::to_string(folder_.units.size()) + " units in the folder, more than a lot of " +
                       std::to_string(record_.lot_size),
                   "give the number of units of the whole lot, measured or not");
  }
  setting_ = {&record_.sheet, record_.lot, job_.operator_name, "", program_name(), context_.now};
  units_.resize(folder_.units.size());
  return {};
}

/// The sheets and captures are not named on the command line, but in the sheet and by the folder.
Result<void> Inspection::spare_what_is_read() const {
  if (!job_.report) return {};
  std::vector<GivenFile> inputs{{"", job_.sheet}, {"", folder_.path}};
  for (const PreparedTest& test : tests_) {
    if (test.plan.bench) add_bench_files(inputs, *test.plan.bench);
  }
  const auto add = [&inputs](const LotUnit& unit) {
    for (const UnitCaptures& captures : unit.tests) {
      for (const std::string& file : captures.files) inputs.push_back({"", file});
    }
  };
  for (const LotUnit& unit : folder_.units) add(unit);
  if (check_captures_) add(*check_captures_);
  return spare_files(std::vector<GivenFile>{{"--report", *job_.report}}, inputs);
}

Result<void> Inspection::look_back() {
  if (!job_.ledger) return {};
  Result<Ledger> ledger =
      Ledger::open({.path = *job_.ledger, .mode = LedgerMode::create, .part = json_safe(record_.sheet.name)});
  if (!ledger) return failure(ledger);
  ledger_ = std::move(*ledger);
  for (std::size_t i = 0; i < units_.size(); ++i) {
    const LotUnit& captures = folder_.units[i];
    Result<UnitPast> past = past_of_unit(*ledger_, record_.sheet, record_.lot, captures, tests_);
    if (!past) return failure(past);
    units_[i].past = std::move(*past);
    if (units_[i].past.recorded) continue;
    // Asked of every unit before the first is measured: a run that stops half-way helps nobody.
    Result<std::string> reason = reason_for(units_[i].past, captures, job_.reason);
    if (!reason) return failure(reason);
    units_[i].reason = std::move(*reason);
  }
  Result<std::vector<LotHistory>> history = lots_before(*ledger_, record_.sheet, record_.lot);
  if (!history) return failure(history);
  history_ = std::move(*history);
  Result<std::vector<Finding>> others = serials_of_other_lots(*ledger_, record_.lot, folder_.units);
  if (!others) return failure(others);
  record_.findings.insert(record_.findings.end(), others->begin(), others->end());
  return {};
}

/// False when the lot may not be inspected; the record then says why.
Result<bool> Inspection::may_begin() {
  std::vector<EquipmentItem> equipment;
  std::set<std::string> listed;
  for (const PreparedTest& test : tests_) {
    for (const EquipmentItem& item : test.equipment) {
      if (listed.insert(item.id + '\n' + item.due).second) equipment.push_back(item);
    }
  }
  const std::chrono::year_month_day today(std::chrono::floor<std::chrono::days>(context_.now));
  for (Finding& each : overdue_calibrations(equipment, today)) record_.findings.push_back(std::move(each));

  const NextSeverity now = next_severity(record_.sheet.sampling, history_);
  record_.severity_why = now.why;
  if (now.severity == Severity105::discontinued) {
    record_.decision.why = "inspection of this part from this supplier is discontinued: " + now.why;
    return false;
  }
  Result<SamplingPlan> plan = plan_for(record_.sheet.sampling, record_.lot_size, now.severity);
  if (!plan) return failure(plan);

  if (record_.sheet.check_standard) {
    Result<CheckOutcome> check = run_check(tests_, check_captures_, ledger_ ? &*ledger_ : nullptr, setting_, context_);
    if (!check) return failure(check);
    record_.check = check->status;
    record_.check_chart = check->chart;
    record_.findings.insert(record_.findings.end(), check->findings.begin(), check->findings.end());
    if (!check->status.may_inspect) {
      record_.decision.why = "no unit was measured: " + check->status.why;
      return false;
    }
  }
  record_.plan = std::move(*plan);
  return true;
}

/// A capture that stands in the ledger under another serial shows nobody knows which unit.
Result<void> Inspection::refuse_captures_of_others(InspectedUnit& unit, const std::string& serial) const {
  for (TestRun& run : unit.runs) {
    for (const SourceRecord& record : run.measurement.sources) {
      if (record.source.sha256.empty()) continue;
      const Result<std::vector<Entry>> entries = ledger_->units_with_digest(record.source.sha256);
      if (!entries) return failure(entries);
      const auto other = std::find_if(entries->begin(), entries->end(),
                                      [&](const Entry& entry) { return entry.content.serial != json_safe(serial); });
      if (other == entries->end()) continue;
      const std::string message = "the same capture was recorded for unit " + shown(other->content.serial, 60) +
                                  " (entry " + std::to_string(other->id) + "), and nobody can tell which unit it shows";
      Measurement refused;
      refused.test = run.measurement.test;
      refused.sources = run.measurement.sources;
      refused.findings.push_back(
          {"duplicate_serial", Severity::refusal, message, serial, static_cast<double>(other->id), Unit::one});
      run.measurement = std::move(refused);
      break;
    }
  }
  return {};
}

Result<std::vector<std::optional<std::int64_t>>> Inspection::store(const std::vector<std::size_t>& fresh) {
  std::vector<std::optional<std::int64_t>> ids(fresh.size());
  if (!ledger_ || fresh.empty()) return ids;
  std::vector<EntryContent> contents;
  for (const std::size_t i : fresh) {
    contents.push_back(unit_entry({units_[i].attempt, units_[i].runs, units_[i].reason}, setting_));
  }
  const Result<std::vector<Entry>> stored = ledger_->append(contents);
  if (!stored) return failure(stored);
  for (std::size_t i = 0; i < ids.size(); ++i) ids[i] = (*stored)[i].id;
  return ids;
}

void Inspection::keep(std::size_t index, std::optional<std::int64_t> entry) {
  InspectedUnit& unit = units_[index];
  std::vector<UnitVerdict> attempts = unit.past.attempts;
  const bool fresh = !unit.past.recorded;
  if (fresh) attempts.push_back(unit.attempt);
  const StandingVerdict standing_now = standing(record_.sheet, attempts);
  LotUnitRecord kept;
  kept.verdict = standing_now.verdict;
  kept.made = standing_now.made;
  kept.counted = standing_now.counted;
  kept.from_ledger = !fresh;
  kept.entry = entry;
  for (const TestRun& run : unit.runs) {
    for (const SourceRecord& each : run.measurement.sources) {
      kept.files.push_back({run.test, each.source.name, each.source.sha256});
    }
  }
  if (!fresh) {
    for (const EntrySource& each : unit.past.entries.back().content.sources) {
      kept.files.push_back({each.test, each.file, each.sha256});
    }
  }
  record_.units.push_back(std::move(kept));
  if (follow_) follow_({unit.attempt, record_.units.back().verdict, entry, !fresh});
}

Result<void> Inspection::measure_batch(std::size_t first, std::size_t end) {
  std::vector<std::size_t> fresh;
  for (std::size_t i = first; i < end; ++i) {
    if (!units_[i].past.recorded) fresh.push_back(i);
  }
  RunContext inside = context_;
  inside.threads = 1;  // units are measured side by side instead
  inside.progress = nullptr;
  for_each_index(fresh.size(), context_.threads, [&](std::size_t i) {
    units_[fresh[i]].runs = run_tests(tests_, folder_.units[fresh[i]], false, inside);
  });
  for (const std::size_t i : fresh) {
    InspectedUnit& unit = units_[i];
    const std::string& serial = folder_.units[i].serial;
    if (ledger_) {
      if (auto fine = refuse_captures_of_others(unit, serial); !fine) return fine;
    }
    unit.attempt = judge_unit(record_.sheet, serial, unit.past.last_attempt + 1, tested(unit.runs));
  }
  const auto ids = store(fresh);
  if (!ids) return failure(ids);
  std::size_t next = 0;
  for (std::size_t i = first; i < end; ++i) {
    if (units_[i].past.recorded) {
      units_[i].attempt = units_[i].past.attempts.back();
      const Result<std::vector<Caution>> cautions = cautions_of_entry(units_[i].past.entries.back().content);
      if (!cautions) return failure(cautions);
      tell_cautions(*cautions);
      keep(i, units_[i].past.entries.back().id);
    } else {
      keep(i, (*ids)[next++]);
    }
  }
  tell_of_tests();
  for (const std::size_t i : fresh) units_[i].runs.clear();
  return {};
}

/// Each once, with the largest figure.
void Inspection::tell_cautions(const std::vector<Caution>& cautions) {
  for (const Caution& caution : cautions) {
    const auto same = std::find_if(record_.cautions.begin(), record_.cautions.end(),
                                   [&](const Caution& c) { return c.code == caution.code; });
    if (same == record_.cautions.end()) record_.cautions.push_back(caution);
    else if (caution.figure > same->figure) *same = caution;
  }
}

/// Of each test the first unit with values stands as the example; cautions about people count once.
void Inspection::tell_of_tests() {
  if (record_.tests.empty()) {
    for (const PreparedTest& test : tests_) {
      const bool captured = std::any_of(folder_.units.begin(), folder_.units.end(),
                                        [&](const LotUnit& unit) { return unit.find(test.plan.name) != nullptr; });
      if (!captured) continue;
      record_.tests.push_back({test.plan.name, test.plan.kind, test.plan.bench, test.bench_sha256, test.equipment,
                               test.room_temperature, std::nullopt, ""});
    }
  }
  for (const InspectedUnit& unit : units_) {
    for (const TestRun& run : unit.runs) {
      for (LotTestRecord& test : record_.tests) {
        if (test.test != run.test || test.example || run.measurement.estimates.empty()) continue;
        test.example = run.measurement;
        test.example_serial = unit.attempt.serial;
      }
      tell_cautions(run.measurement.cautions);
    }
  }
}

Result<void> Inspection::measure_all() {
  const std::string what = "measuring the units of lot " + shown(record_.lot, 60);
  for (std::size_t first = 0; first < units_.size(); first += kLargestBatch) {
    if (context_.progress != nullptr && !context_.progress->advance(what, first, units_.size())) {
      return failure(Problem::interrupted, job_.folder, "the run was stopped",
                     "start it again: with a ledger it goes on where it stopped");
    }
    if (auto done = measure_batch(first, std::min(first + kLargestBatch, units_.size())); !done) return done;
  }
  return {};
}

/// The tests that a unit's verdict rests on where it does not pass.
std::vector<PreparedTest> telling_tests(const std::vector<PreparedTest>& tests, const UnitVerdict& verdict) {
  std::vector<PreparedTest> telling;
  for (const PreparedTest& test : tests) {
    const bool tells = std::any_of(verdict.limits.begin(), verdict.limits.end(), [&](const LimitVerdict& limit) {
      return limit.verdict != Verdict::pass && limit.test == test.plan.name;
    });
    if (tells) telling.push_back(test);
  }
  return telling;
}

/// Every unit that does not pass is measured once more with what the figures of those tests need that tell of it.
void Inspection::keep_figures() {
  std::vector<std::size_t> which;
  for (std::size_t i = 0; i < record_.units.size(); ++i) {
    if (record_.units[i].verdict.verdict != Verdict::pass) which.push_back(i);
  }
  RunContext inside = context_;
  inside.threads = 1;
  inside.progress = nullptr;
  for_each_index(which.size(), context_.threads, [&](std::size_t i) {
    LotUnitRecord& unit = record_.units[which[i]];
    for (TestRun& run : run_tests(telling_tests(tests_, unit.verdict), folder_.units[which[i]], true, inside)) {
      unit.shown.push_back(std::move(run.measurement));
    }
  });
  // With every entry from an earlier run there is no example yet.
  for (LotTestRecord& test : record_.tests) {
    for (std::size_t i = 0; !test.example && i < folder_.units.size(); ++i) {
      for (TestRun& run : run_tests(tests_, folder_.units[i], false, inside)) {
        if (test.example || run.test != test.test || run.measurement.estimates.empty()) continue;
        test.example = std::move(run.measurement);
        test.example_serial = folder_.units[i].serial;
      }
    }
  }
}

Result<LotRecord> Inspection::run() {
  if (auto read = read_everything(); !read) return failure(read);
  if (auto looked = look_back(); !looked) return failure(looked);
  const Result<bool> begin = may_begin();
  if (!begin) return failure(begin);
  if (!*begin) {
    if (ledger_) {
      const Result<LedgerHead> head = ledger_->head();
      if (!head) return failure(head);
      record_.ledger = LotLedger{*job_.ledger, 0, 0, head->hash, std::nullopt, std::nullopt};
    }
    return std::move(record_);
  }
  if (auto measured = measure_all(); !measured) return failure(measured);
  if (auto closed = close_lot(record_, history_, ledger_ ? &*ledger_ : nullptr, job_.ledger.value_or(""), setting_); !closed) {
    return failure(closed);
  }
  if (job_.for_page) keep_figures();
  return std::move(record_);
}

}  // namespace

Result<LotRecord> run_inspect(const InspectJob& job, const RunContext& context, const UnitFollower& follow) {
  return Inspection(job, context, follow).run();
}

}  // namespace coilassay

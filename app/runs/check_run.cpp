#include "app/runs/check_run.h"

#include <algorithm>
#include <cassert>
#include <cmath>

#include "base/outside_text.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

/// Whether an entry holds these very captures.
bool same_sources(const EntryContent& a, const EntryContent& b) {
  std::vector<std::string> x, y;
  for (const EntrySource& source : a.sources) x.push_back(source.sha256);
  for (const EntrySource& source : b.sources) y.push_back(source.sha256);
  std::sort(x.begin(), x.end());
  std::sort(y.begin(), y.end());
  return x == y;
}

/// The measured value joins the readings, and the ledger unless it is in it.
Result<void> take_reading(const Estimate& value, const std::vector<TestRun>& runs, const std::vector<Entry>& before,
                          Ledger* ledger, const InspectionSetting& setting, std::vector<CheckReading>& readings) {
  const EntryContent entry = check_entry(value, runs, setting);
  const auto known = std::find_if(before.begin(), before.end(),
                                  [&](const Entry& each) { return same_sources(each.content, entry); });
  if (known != before.end()) return {};
  if (ledger != nullptr) {
    if (const Result<Entry> stored = ledger->append(entry); !stored) return failure(stored);
  }
  readings.push_back({setting.now, value.quantity.value});
  return {};
}

}  // namespace

std::optional<Estimate> check_value(const PartSheet& sheet, const std::vector<TestRun>& runs) {
  assert(sheet.check_standard);
  const CheckStandard& standard = *sheet.check_standard;
  Limit limit;
  limit.quantity = standard.quantity;
  limit.unit = standard.unit;
  limit.test = standard.test;
  for (const Limit& each : sheet.limits) {
    const bool same_test = standard.test.empty() || each.test.empty() || each.test == standard.test;
    if (each.quantity != standard.quantity || !same_test) continue;
    limit.at = each.at;
    break;
  }
  limit.min = -HUGE_VAL;  // its value is wanted, no verdict
  const LimitVerdict judged = judge_limit(limit, sheet, tested(runs));
  if (!judged.value || judged.verdict == Verdict::not_comparable) return std::nullopt;
  Estimate value;
  value.symbol = standard.quantity;
  value.quantity = {*judged.value, judged.u.value_or(std::nan("")), standard.unit};
  return value;
}

Result<CheckOutcome> run_check(const std::vector<PreparedTest>& tests, const std::optional<LotUnit>& captures,
                               Ledger* ledger, const InspectionSetting& setting, const RunContext& context) {
  assert(setting.sheet->check_standard);
  const CheckStandard& standard = *setting.sheet->check_standard;
  CheckOutcome outcome;
  std::vector<CheckReading> readings;
  std::vector<Entry> before;
  if (ledger != nullptr) {
    Result<std::vector<Entry>> entries = ledger->checks(json_safe(standard.serial));
    if (!entries) return failure(entries);
    before = std::move(*entries);
    for (const Entry& entry : before) {
      const Result<CheckReading> reading = check_reading_of(entry.content);
      if (!reading) return failure(reading);
      readings.push_back(*reading);
    }
  }
  if (captures) {
    const std::vector<TestRun> runs = run_tests(tests, *captures, false, context);
    const std::optional<Estimate> value = check_value(*setting.sheet, runs);
    if (value) {
      if (auto taken = take_reading(*value, runs, before, ledger, setting, readings); !taken) return failure(taken);
    } else {
      outcome.findings.push_back({"check_standard", Severity::caution,
                                  "the captures of the check standard " + shown(standard.serial, 60) + " gave no " +
                                      standard.quantity + ": capture it again",
                                  standard.serial, 0, Unit::one});
    }
  }
  outcome.chart = check_chart(standard, std::move(readings));
  outcome.status = check_status(standard, outcome.chart, setting.now);
  if (outcome.status.state != CheckState::good) {
    outcome.findings.push_back({"check_standard", Severity::caution, outcome.status.why, standard.serial,
                                static_cast<double>(outcome.chart.readings.size()), Unit::one});
  } else if (!outcome.status.trend.empty()) {
    outcome.findings.push_back({"check_standard", Severity::note,
                                outcome.status.why + ", but its readings hang together (" + outcome.status.trend + "): look for what drifts",
                                standard.serial, static_cast<double>(outcome.chart.readings.size()), Unit::one});
  }
  return outcome;
}

}  // namespace coilassay

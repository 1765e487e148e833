#include "inspection/readiness.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/statistics.h"
#include "inspection/capability.h"

namespace coilassay {

namespace {

constexpr double kLimitSigmas = 3;
constexpr double kDay_s = 86400;

double seconds_between(UtcTime from, UtcTime to) { return static_cast<double>((to - from).count()); }

/// Within the limits readings can still hang together: the run rules of capability.h on the chart's own centre and sigma.
std::string trend_in_words(const CheckChart& chart, std::size_t seen) {
  std::vector<double> values;
  for (std::size_t i = 0; i < seen; ++i) values.push_back(chart.readings[i].value);
  const auto individuals = individuals_chart(values, chart.centre, chart.sigma);
  if (!individuals) return {};
  for (const RunSignal& signal : individuals->signals) {
    if (signal.at + 1 == seen && signal.rule != RunRule::beyond_3_sigma) return std::string(name(signal.rule));
  }
  return {};
}

}  // namespace

std::vector<Finding> overdue_calibrations(std::span<const EquipmentItem> equipment, std::chrono::year_month_day today) {
  std::vector<Finding> findings;
  for (const EquipmentItem& item : equipment) {
    const auto due = parse_date(item.due);
    if (!due || std::chrono::sys_days(*due) >= std::chrono::sys_days(today)) continue;  // good to the end of its day
    const auto days = (std::chrono::sys_days(today) - std::chrono::sys_days(*due)).count();
    findings.push_back({"calibration_overdue", Severity::caution,
                        fmt::format("calibration of {} was due {}, {} ago: its stated uncertainty may no longer hold", shown(item.id, 60),
                                    to_text(*due), days == 1 ? "1 day" : fmt::format("{} days", days)),
                        shown(item.id, 60), static_cast<double>(days) * kDay_s, Unit::second});
  }
  std::stable_sort(findings.begin(), findings.end(), [](const Finding& a, const Finding& b) { return a.figure > b.figure; });
  return findings;
}

CheckChart check_chart(const CheckStandard& standard, std::vector<CheckReading> readings) {
  std::stable_sort(readings.begin(), readings.end(), [](const CheckReading& a, const CheckReading& b) { return a.time < b.time; });
  CheckChart chart;
  chart.readings = std::move(readings);
  chart.out.assign(chart.readings.size(), false);
  if (standard.centre && standard.sigma) {
    chart.centre = *standard.centre;
    chart.sigma = *standard.sigma;
  } else {
    if (chart.readings.size() < standard.baseline) return chart;
    std::vector<double> first;
    for (std::size_t i = 0; i < standard.baseline; ++i) first.push_back(chart.readings[i].value);
    const Summary summary = summarise(first);
    if (!(summary.standard_deviation > 0)) return chart;  // equal readings make no limits
    chart.centre = summary.mean;
    chart.sigma = summary.standard_deviation;
  }
  chart.established = true;
  chart.low = chart.centre - kLimitSigmas * chart.sigma;
  chart.high = chart.centre + kLimitSigmas * chart.sigma;
  for (std::size_t i = 0; i < chart.readings.size(); ++i) {
    const double value = chart.readings[i].value;
    chart.out[i] = !(value >= chart.low && value <= chart.high);
  }
  return chart;
}

CheckStatus check_status(const CheckStandard& standard, const CheckChart& chart, UtcTime now) {
  CheckStatus status;
  std::size_t seen = chart.readings.size();
  while (seen > 0 && chart.readings[seen - 1].time > now) --seen;  // what is yet to come says nothing
  for (std::size_t i = 0; i < seen && chart.established; ++i) {
    if (!chart.out[i]) status.last_good = chart.readings[i].time;
  }
  const std::string serial = shown(standard.serial, 60);
  if (seen == 0) {
    status.state = CheckState::never;
    status.why = fmt::format("check standard {} has not been measured", serial);
  } else if (chart.established && chart.out[seen - 1]) {
    status.state = CheckState::out;
    status.why = fmt::format("check standard {} reads {}, outside {} to {}", serial, to_text(chart.readings[seen - 1].value, standard.unit),
                             to_text(chart.low, standard.unit), to_text(chart.high, standard.unit));
    status.why += status.last_good ? fmt::format("; it was last good {}: units measured since then are in doubt", to_text(*status.last_good))
                                   : "; it has never been good";
  } else if (const double age = seconds_between(chart.readings[seen - 1].time, now); age > standard.every_s) {
    status.state = CheckState::overdue;
    status.why = fmt::format("check standard {} was measured {:.3g} h ago, and is due every {:.3g} h", serial, age / 3600, standard.every_s / 3600);
  } else if (!chart.established) {
    status.state = CheckState::not_established;
    status.why = fmt::format("check standard {} has {} of the {} readings its limits need", serial, seen, standard.baseline);
  } else {
    status.state = CheckState::good;
    status.why = fmt::format("check standard {} is good", serial);
    status.trend = trend_in_words(chart, seen);
  }
  // While the first readings are being collected there is nothing to refuse by.
  status.may_inspect = status.state == CheckState::good || status.state == CheckState::not_established || !standard.refuse;
  return status;
}

}  // namespace coilassay

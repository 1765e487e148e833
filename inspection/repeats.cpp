#include "inspection/repeats.h"

#include <fmt/format.h>

#include <algorithm>
#include <cassert>
#include <cmath>

#include "fitting/statistics.h"

namespace coilassay {

constexpr double kNormalFactor = 1.959963984540054;

EvidenceValue mean_of_repeats(std::span<const EvidenceValue> repeats) {
  assert(!repeats.empty());
  if (repeats.size() == 1) return repeats.front();
  const double n = static_cast<double>(repeats.size());
  std::vector<double> values;
  double squares = 0, own_squares = 0, down = 0, up = 0;
  for (const EvidenceValue& repeat : repeats) {
    const Estimate& e = repeat.estimate;
    const double u = e.quantity.standard_uncertainty, own = std::min(repeat.u_own.value_or(0), u);
    values.push_back(e.quantity.value);
    squares += u * u / n;
    own_squares += own * own / n;
    down += (u > 0 ? (e.quantity.value - e.low) / u : kNormalFactor) / n;
    up += (u > 0 ? (e.high - e.quantity.value) / u : kNormalFactor) / n;
  }
  const Summary summary = summarise(values);
  const double scatter = summary.standard_deviation, common = std::sqrt(std::max(squares - own_squares, 0.0));
  const bool scatter_rules = scatter * scatter > own_squares;
  const double own = scatter_rules ? scatter / std::sqrt(n) : std::sqrt(own_squares / n);
  EvidenceValue mean = repeats.front();
  mean.estimate.quantity.value = summary.mean;
  mean.estimate.quantity.standard_uncertainty = std::hypot(common, own);
  mean.u_own = own;
  mean.from = fmt::format("mean of {}, {}", repeats.size(), repeats.front().from);
  // Each part of the half-width by its own factor; the sides keep their proportion.
  const double t = student_t_quantile((1 + mean.estimate.confidence) / 2, n - 1);
  const double own_down = scatter_rules ? t * own : down * own, own_up = scatter_rules ? t * own : up * own;
  mean.estimate.low = summary.mean - std::hypot(down * common, own_down);
  mean.estimate.high = summary.mean + std::hypot(up * common, own_up);
  mean.estimate.k = mean.estimate.half_width() / mean.estimate.quantity.standard_uncertainty;
  if (scatter_rules) mean.estimate.dof = n - 1;
  return mean;
}

namespace {

/// Every limit had a comparable value (or a bound that decided): the attempt says something about the unit.
bool is_a_result(const UnitVerdict& unit) {
  return !unit.limits.empty() && std::all_of(unit.limits.begin(), unit.limits.end(), [](const LimitVerdict& v) {
    return v.value.has_value() || v.from == "bound";
  });
}

EvidenceValue value_of(const LimitVerdict& v) {
  EvidenceValue value;
  value.estimate.symbol = v.quantity;
  value.estimate.quantity = {*v.value, v.u.value_or(std::nan("")), v.unit};
  value.estimate.low = v.low.value_or(std::nan(""));
  value.estimate.high = v.high.value_or(std::nan(""));
  value.u_own = v.u_own;
  value.from = v.from;
  return value;
}

UnitVerdict mean_of_attempts(const PartSheet& sheet, std::span<const UnitVerdict* const> attempts) {
  UnitVerdict unit = *attempts.back();
  for (std::size_t l = 0; l < unit.limits.size(); ++l) {
    std::vector<EvidenceValue> values;
    for (const UnitVerdict* attempt : attempts) {
      if (l < attempt->limits.size() && attempt->limits[l].value && attempt->limits[l].u) values.push_back(value_of(attempt->limits[l]));
    }
    if (values.size() == attempts.size()) unit.limits[l] = judge_again(unit.limits[l], mean_of_repeats(values), sheet);
  }
  unit.verdict = combined(unit.limits);
  return unit;
}

}  // namespace

StandingVerdict standing(const PartSheet& sheet, std::span<const UnitVerdict> attempts) {
  assert(!attempts.empty());
  StandingVerdict standing;
  standing.made = attempts.size();
  std::vector<const UnitVerdict*> counted;
  std::uint64_t beyond = 0;
  for (const UnitVerdict& attempt : attempts) {
    if (!is_a_result(attempt)) continue;
    if (counted.size() < sheet.retest.attempts) counted.push_back(&attempt);
    else ++beyond;
  }
  standing.counted = counted.size();
  if (counted.empty()) {
    standing.verdict = attempts.back();
  } else if (sheet.retest.use == RetestUse::first || counted.size() == 1) {
    standing.verdict = *counted.front();
  } else {
    standing.verdict = mean_of_attempts(sheet, counted);
  }
  if (beyond > 0) {
    standing.verdict.findings.push_back(
        {"retest_limit", Severity::caution,
         fmt::format("{} attempts gave a result and {} may count: what came later is kept and does not count", counted.size() + beyond,
                     sheet.retest.attempts),
         "", static_cast<double>(counted.size() + beyond), Unit::one});
  }
  return standing;
}

}  // namespace coilassay

#include "inspection/lot_values.h"

#include <algorithm>
#include <cmath>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr double kTwoSided = 0.975;

struct Values {
  std::vector<double> x;
  double own = 0, common = 0;  // sums of squares
};

void take(Values& values, const LimitVerdict& limit) {
  if (!limit.value || !std::isfinite(*limit.value) || limit.verdict == Verdict::not_comparable) return;
  values.x.push_back(*limit.value);
  const double u = limit.u.value_or(0), own = std::min(limit.u_own.value_or(0), u);
  values.own += own * own;
  values.common += u * u - own * own;
}

LotValues statistic_of(const Values& values) {
  const Summary summary = summarise(values.x);
  LotValues result;
  result.n = summary.count;
  result.mean = summary.mean;
  result.least = summary.min;
  result.most = summary.max;
  const auto n = static_cast<double>(summary.count);
  result.u_own = std::sqrt(values.own / n);
  result.u_common = std::sqrt(values.common / n);
  if (summary.count < 2) return result;
  const double s = summary.standard_deviation;
  result.deviation = s;
  result.spread = std::sqrt(std::max(0.0, s * s - result.u_own * result.u_own));
  const double scatter = student_t_quantile(kTwoSided, n - 1) * s / std::sqrt(n);
  result.U_mean = std::hypot(scatter, normal_quantile(kTwoSided) * result.u_common);
  return result;
}

}  // namespace

std::vector<LotValues> lot_values(std::span<const UnitVerdict> units) {
  std::vector<LotValues> all;
  const std::size_t limits = units.empty() ? 0 : units.front().limits.size();
  for (std::size_t i = 0; i < limits; ++i) {
    Values values;
    for (const UnitVerdict& unit : units) take(values, unit.limits[i]);
    if (values.x.empty()) continue;
    LotValues statistic = statistic_of(values);
    statistic.limit = i;
    statistic.quantity = units.front().limits[i].quantity;
    statistic.unit = units.front().limits[i].unit;
    statistic.capability = capability_of(values.x, units.front().limits[i].min, units.front().limits[i].max);
    if (const auto chart = individuals_chart(values.x)) statistic.signals = chart->signals;
    all.push_back(statistic);
  }
  return all;
}

}  // namespace coilassay

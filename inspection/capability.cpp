#include "inspection/capability.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

const double kD2 = 2 / std::sqrt(std::numbers::pi);   // mean range of two normal values, in sigma: 1.128
constexpr double kRangeLimit = 3.267;                 // D4 of ranges of two: 1 + 3 d3/d2 = 1 + 3 x 0.8525/1.1284
constexpr double kNormalFactor = 1.959963984540054;

std::vector<double> finite_ones(std::span<const double> values) {
  std::vector<double> kept;
  std::copy_if(values.begin(), values.end(), std::back_inserter(kept), [](double v) { return std::isfinite(v); });
  return kept;
}

double mean_moving_range(std::span<const double> values) {
  double sum = 0;
  for (std::size_t i = 1; i < values.size(); ++i) sum += std::fabs(values[i] - values[i - 1]);
  return sum / static_cast<double>(values.size() - 1);
}

/// Degrees of freedom a standard deviation from moving ranges is worth: its relative variance is (0.826 n - 1.082)/(n - 1)^2
/// for normal values that do not hang together.
double dof_of_moving_range(double n) { return (n - 1) * (n - 1) / (2 * (0.826 * n - 1.082)); }

/// Index of the whole tolerance: proportional to 1/s, so its interval is that of a chi-square law.
Index two_sided(double tolerance, double s, double dof) {
  const double value = tolerance / (6 * s);
  return {value, value * std::sqrt(chi_square_quantile(0.025, dof) / dof), value * std::sqrt(chi_square_quantile(0.975, dof) / dof)};
}

/// Index of the nearest limit, with the interval of Bissell (1990): the mean varies by s^2/n, the deviation by its own law.
Index nearest(double distance, double s, double n, double dof) {
  const double value = distance / (3 * s);
  const double half = kNormalFactor * std::sqrt(1 / (9 * n) + value * value / (2 * dof));
  return {value, value - half, value + half};
}

}  // namespace

std::string_view name(RunRule rule) {
  switch (rule) {
    case RunRule::beyond_3_sigma: return "beyond 3 sigma";
    case RunRule::two_of_three: return "2 of 3 beyond 2 sigma on one side";
    case RunRule::four_of_five: return "4 of 5 beyond 1 sigma on one side";
    case RunRule::eight_on_one_side: return "8 in a row on one side";
  }
  return "";
}

std::optional<Capability> capability_of(std::span<const double> values, std::optional<double> min, std::optional<double> max) {
  const std::vector<double> kept = finite_ones(values);
  if (kept.size() < 3 || (!min && !max)) return std::nullopt;
  const Summary summary = summarise(kept);
  const double within = mean_moving_range(kept) / kD2, n = static_cast<double>(kept.size());
  if (!(summary.standard_deviation > 0) || !(within > 0)) return std::nullopt;
  Capability out;
  out.n = kept.size();
  out.mean = summary.mean;
  out.deviation_overall = summary.standard_deviation;
  out.deviation_within = within;
  const double distance = std::min(max ? *max - out.mean : HUGE_VAL, min ? out.mean - *min : HUGE_VAL);
  const double dof_within = dof_of_moving_range(n);
  if (min && max) {
    out.cp = two_sided(*max - *min, within, dof_within);
    out.pp = two_sided(*max - *min, out.deviation_overall, n - 1);
  }
  out.cpk = nearest(distance, within, n, dof_within);
  out.ppk = nearest(distance, out.deviation_overall, n, n - 1);
  return out;
}

std::optional<IndividualsChart> individuals_chart(std::span<const double> values, std::optional<double> centre,
                                                  std::optional<double> sigma) {
  IndividualsChart chart;
  chart.values = finite_ones(values);
  if (chart.values.size() < 3) return std::nullopt;
  for (std::size_t i = 1; i < chart.values.size(); ++i) chart.ranges.push_back(std::fabs(chart.values[i] - chart.values[i - 1]));
  chart.mean_range = mean_moving_range(chart.values);
  chart.centre = centre.value_or(summarise(chart.values).mean);
  chart.sigma = sigma.value_or(chart.mean_range / kD2);
  if (sigma) chart.mean_range = *sigma * kD2;
  chart.low = chart.centre - 3 * chart.sigma;
  chart.high = chart.centre + 3 * chart.sigma;
  chart.range_limit = kRangeLimit * chart.mean_range;
  for (std::size_t i = 0; i < chart.ranges.size(); ++i) {
    if (chart.ranges[i] > chart.range_limit) chart.ranges_out.push_back(i);
  }
  // How many of the last `window` points up to i lie beyond so many sigma on the side of point i, which is one of them.
  const auto beyond = [&](std::size_t i, std::size_t window, double sigmas) {
    const double side = chart.values[i] >= chart.centre ? 1 : -1;
    const auto lies = [&](std::size_t k) { return side * (chart.values[k] - chart.centre) > sigmas * chart.sigma; };
    std::size_t count = 0;
    for (std::size_t k = i + 1 >= window ? i + 1 - window : 0; k <= i; ++k) {
      if (lies(k)) ++count;
    }
    return lies(i) ? count : std::size_t{0};
  };
  for (std::size_t i = 0; i < chart.values.size(); ++i) {
    if (beyond(i, 1, 3) >= 1) chart.signals.push_back({RunRule::beyond_3_sigma, i});
    if (beyond(i, 3, 2) >= 2) chart.signals.push_back({RunRule::two_of_three, i});
    if (beyond(i, 5, 1) >= 4) chart.signals.push_back({RunRule::four_of_five, i});
    if (beyond(i, 8, 0) >= 8) chart.signals.push_back({RunRule::eight_on_one_side, i});
  }
  return chart;
}

}  // namespace coilassay

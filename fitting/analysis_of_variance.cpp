#include "fitting/analysis_of_variance.h"

#include <cassert>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

/// Mean in two passes: certified data sets carry a large offset, and the sum of deviations corrects the first pass.
double mean_of(std::span<const double> values) {
  double sum = 0, rest = 0;
  for (const double v : values) sum += v;
  const double n = static_cast<double>(values.size()), mean = sum / n;
  for (const double v : values) rest += v - mean;
  return mean + rest / n;
}

double squares_about(std::span<const double> values, double mean) {
  double squares = 0;
  for (const double v : values) squares += (v - mean) * (v - mean);
  return squares;
}

VarianceLine line(double dof, double sum_of_squares) {
  return {dof, sum_of_squares, dof > 0 ? sum_of_squares / dof : std::nan("")};
}

void test_against(VarianceLine& tested, const VarianceLine& yardstick) {
  if (!(tested.dof > 0) || !(yardstick.dof > 0)) return;
  tested.f = tested.mean_square / yardstick.mean_square;
  tested.p = f_upper_tail(tested.f, tested.dof, yardstick.dof);
}

}  // namespace

OneWayAnalysis analyse_one_way(std::span<const std::vector<double>> groups) {
  assert(groups.size() >= 2);
  std::vector<double> all;
  for (const auto& group : groups) {
    assert(!group.empty());
    all.insert(all.end(), group.begin(), group.end());
  }
  const double mean = mean_of(all);
  double between = 0, within = 0;
  for (const auto& group : groups) {
    const double own = mean_of(group);
    between += static_cast<double>(group.size()) * (own - mean) * (own - mean);
    within += squares_about(group, own);
  }
  const double k = static_cast<double>(groups.size()), n = static_cast<double>(all.size());
  OneWayAnalysis out;
  out.between = line(k - 1, between);
  out.within = line(n - k, within);
  out.total_sum_of_squares = squares_about(all, mean);
  test_against(out.between, out.within);
  return out;
}

TwoWayAnalysis analyse_two_way(std::span<const double> values, std::size_t first, std::size_t second, std::size_t replicates) {
  assert(first >= 2 && second >= 1 && replicates >= 2 && values.size() == first * second * replicates);
  const double a = static_cast<double>(first), b = static_cast<double>(second), r = static_cast<double>(replicates);
  const double mean = mean_of(values);
  std::vector<double> cell(first * second), of_first(first, 0.0), of_second(second, 0.0);
  double within = 0;
  for (std::size_t c = 0; c < cell.size(); ++c) {
    const auto readings = values.subspan(c * replicates, replicates);
    cell[c] = mean_of(readings);
    within += squares_about(readings, cell[c]);
    of_first[c / second] += (cell[c] - mean) / b;    // deviations, so that no digits are lost to the offset
    of_second[c % second] += (cell[c] - mean) / a;
  }
  double ss_first = 0, ss_second = 0, ss_interaction = 0;
  for (const double d : of_first) ss_first += b * r * d * d;
  for (const double d : of_second) ss_second += a * r * d * d;
  for (std::size_t c = 0; c < cell.size(); ++c) {
    const double rest = cell[c] - mean - of_first[c / second] - of_second[c % second];
    ss_interaction += r * rest * rest;
  }
  TwoWayAnalysis out;
  out.first = line(a - 1, ss_first);
  out.second = line(b - 1, ss_second);
  out.interaction = line((a - 1) * (b - 1), second > 1 ? ss_interaction : 0);
  out.within = line(a * b * (r - 1), within);
  out.total_sum_of_squares = squares_about(values, mean);
  test_against(out.first, second > 1 ? out.interaction : out.within);
  test_against(out.second, out.interaction);
  test_against(out.interaction, out.within);
  return out;
}

}  // namespace coilassay

// Variance split by its causes: one-way, and two-way crossed with replicates.
#pragma once

#include <cmath>
#include <cstddef>
#include <span>
#include <vector>

namespace coilassay {

/// One line of the table. `f` is against the line named with it, `p` the probability of a larger f by chance; NaN for the
/// line that is the yardstick.
struct VarianceLine {
  double dof = 0, sum_of_squares = 0, mean_square = 0;
  double f = std::nan(""), p = std::nan("");
};

struct OneWayAnalysis {
  VarianceLine between, within;   // between: f against within
  double total_sum_of_squares = 0;
};

/// Groups of any sizes; needs two groups, none empty, and more values than groups.
OneWayAnalysis analyse_one_way(std::span<const std::vector<double>> groups);

struct TwoWayAnalysis {
  VarianceLine first, second;     // f against the interaction
  VarianceLine interaction;       // f against within
  VarianceLine within;
  double total_sum_of_squares = 0;
};

/// `values[(i * second + j) * replicates + k]`: level i of the first factor, j of the second, replicate k; every cell full.
/// Needs two levels of the first factor and two replicates; with one level of the second its line and the interaction have
/// no degrees of freedom, and the first is tested against within.
TwoWayAnalysis analyse_two_way(std::span<const double> values, std::size_t first, std::size_t second, std::size_t replicates);

}  // namespace coilassay

// How well a process keeps its limits: Cp, Cpk, Pp, Ppk with intervals, and whether it is steady enough to say so.
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

namespace coilassay {

struct Index {
  double value = 0, low = 0, high = 0;   // 95 %
};

/// Cp and Cpk from the short-term deviation (mean moving range / 1.128), Pp and Ppk from the overall one. Cp and Pp are
/// absent with one limit. docs/formulas.md#capability
struct Capability {
  std::size_t n = 0;
  double mean = 0;
  double deviation_within = 0, deviation_overall = 0;
  std::optional<Index> cp, cpk, pp, ppk;
};

/// std::nullopt with fewer than three values, no limit, or no variation. Values in the order they were made; NaN are left out.
std::optional<Capability> capability_of(std::span<const double> values, std::optional<double> min, std::optional<double> max);

/// Run rules of the Western Electric Statistical Quality Control Handbook (1956; from memory).
enum class RunRule {
  beyond_3_sigma,     // 1 point
  two_of_three,       // beyond 2 sigma on one side
  four_of_five,       // beyond 1 sigma on one side
  eight_on_one_side,
};
std::string_view name(RunRule rule);

struct RunSignal {
  RunRule rule = RunRule::beyond_3_sigma;
  std::size_t at = 0;   // index of the point that completes it
};

/// Chart of individual values and moving ranges of two.
struct IndividualsChart {
  double centre = 0, sigma = 0, low = 0, high = 0;           // centre +- 3 sigma, sigma = mean range / 1.128
  std::vector<double> values, ranges;                        // ranges[i] between value i and i + 1
  double mean_range = 0, range_limit = 0;                    // 3.267 mean range
  std::vector<RunSignal> signals;                            // of the values
  std::vector<std::size_t> ranges_out;                       // indices into ranges
};

/// std::nullopt with fewer than three values. With a stated centre and sigma the limits are made from those.
std::optional<IndividualsChart> individuals_chart(std::span<const double> values, std::optional<double> centre = std::nullopt,
                                                  std::optional<double> sigma = std::nullopt);

}  // namespace coilassay

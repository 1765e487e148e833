#include "fitting/circuit_limits.h"

#include <algorithm>
#include <cmath>

namespace coilassay {

namespace {

using P = CircuitParameter;
constexpr int kIterations = 60;
constexpr double kSettled = 1e-6;
// Further than this many standard uncertainties from the end of its range a parameter is seen, and needs no profile.
constexpr double kPlainlySeen = 4;

/// Chi-square with parameter i held at `value`, the others fitted again from `near`.
SettledCircuit profile(const CircuitEquations& equations, const Circuit& near, std::size_t i, P parameter, double value) {
  Circuit start = near;
  start[parameter] = value;
  return descend(equations, start, HeldParameters{1} << i, kIterations, kSettled);
}

}  // namespace

void find_limits(const CircuitEquations& equations, CircuitFit& fit) {
  const double quantile = fit.coverage_factor() * fit.scale;
  const double rise = quantile * quantile;
  for (std::size_t i = 0; i < fit.order.size(); ++i) {
    const P parameter = fit.order[i];
    if (parameter == P::second_frequency || parameter == P::second_damping) continue;
    const bool share = parameter == P::relaxation_share;
    const double value = fit.circuit[parameter], u = fit.standard_uncertainty(parameter);
    const double from_end = share ? 1 - value : value;
    if (from_end > kPlainlySeen * u) continue;
    const SettledCircuit at_end = profile(equations, fit.circuit, i, parameter, share ? 1.0 : 0.0);
    if (!(at_end.chi - fit.chi_square < rise)) continue;

    // The limit, by bisection of the logarithm between the minimum and a place plainly beyond.
    CircuitLimit limit;
    limit.parameter = parameter;
    limit.at_most = !share;
    double inside = std::max(value, share ? 0.0 : 1e-3 * u), outside = inside;
    Circuit near = fit.circuit;
    if (share) inside = outside = value;
    bool found = false;
    for (int k = 0; k < 60 && !found; ++k) {
      outside = share ? outside / 1.5 : std::max(outside * 1.5, value + 2 * u);
      const SettledCircuit next = profile(equations, near, i, parameter, outside);
      found = next.chi - fit.chi_square > rise;
      if (found) break;
      inside = outside;
      near = next.circuit;
    }
    if (!found) outside = inside = share ? 0.0 : HUGE_VAL;
    for (int k = 0; found && k < 30 && std::fabs(outside / inside - 1) > 1e-3; ++k) {
      const double middle = std::sqrt(inside * outside);
      const SettledCircuit next = profile(equations, near, i, parameter, middle);
      if (next.chi - fit.chi_square > rise) {
        outside = middle;
      } else {
        inside = middle;
        near = next.circuit;
      }
    }
    limit.value = outside;
    limit.circuit = near;
    if (found) limit.circuit[parameter] = limit.value;
    fit.limits.push_back(limit);
    // Where the effect grows with the square (losses without phases) the slope at the minimum promises too much.
    const auto k = static_cast<Eigen::Index>(i);
    const double wide = limit.at_most && found ? limit.value / fit.coverage_factor() : 0;
    fit.fit.covariance(k, k) = std::fmax(fit.fit.covariance(k, k), wide * wide);
    fit.log_covariance(k, k) = fit.fit.covariance(k, k) / (value * value);
    fit.fit.at_bound[i] = true;
  }
}

}  // namespace coilassay

#include "fitting/damped_sine_settle.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <utility>
#include <vector>

#include "fitting/blocks.h"

namespace coilassay {

std::optional<Shape> first_shape(std::span<const double> y, const Beginning& beginning) {
  const double d = static_cast<double>(beginning.decimation);
  const std::span<const double> values = beginning.averages.empty() ? y : std::span<const double>(beginning.averages);
  StrongestLine line = beginning.line;  // in units of the averages
  line.omega *= d;
  line.omega_error *= d;
  line.length /= beginning.decimation;
  const double length = static_cast<double>(line.length);
  const bool trusted = line.cycles >= kTrustedCycles;
  const double reach = (trusted ? 40 : 8) * length;
  const std::size_t span = static_cast<std::size_t>(std::min(reach, static_cast<double>(values.size())));
  Plan plan = plan_with_length(span, span, length / 16, trusted ? line.omega : 0);
  const PresentSum head = present_sum(values.first(std::min<std::size_t>(span, 4096)), 0);
  const double reference = head.count > 0 ? head.sum / static_cast<double>(head.count) : 0;
  const WhiteBlocks blocks = compress(values.first(span), plan, reference);
  const ShapeLimits limits = shape_limits(span);
  std::vector<std::pair<double, Shape>> scored;
  for (const Shape& shape : starting_shapes(line)) {
    if (!limits.allow(shape)) continue;
    const auto at = equations<1>(blocks, {shape}, false);
    if (at.solvable) scored.emplace_back(at.chi_square, shape);
  }
  std::sort(scored.begin(), scored.end(), [](const auto& x, const auto& z) { return x.first < z.first; });
  Solution<1> best;
  const std::size_t tries = trusted ? 1 : 2;
  for (std::size_t i = 0; i < std::min(tries, scored.size()); ++i) {
    Solution<1> solution = refine<1>(blocks, {scored[i].second}, limits);
    if (solution.gain() > best.gain()) best = solution;
  }
  if (!best.at.solvable) return std::nullopt;
  return Shape{best.shapes[0].a / d, best.shapes[0].q / (d * d)};
}

Settled settle(std::span<const double> y, const Shape& start, double reference, ShortSums sums) {
  Settled settled;
  const ShapeLimits limits = shape_limits(y.size());
  Shape shape = start;
  for (int round = 0; round < 6; ++round) {
    double omega_uncertainty = 0;
    if (settled.solution.at.solvable && shape.q > 0) {
      const Eigen::MatrixXd inverse = inverse_normal<1>(settled.solution.at);
      if (inverse.size() > 0)
        omega_uncertainty = std::sqrt(inverse(1, 1) * settled.solution.variance) / (2 * shape.omega());
    }
    settled.plan = plan_for(shape, omega_uncertainty, y.size());
    settled.blocks = compress(y, settled.plan, sums, reference);
    settled.solution = refine<1>(settled.blocks, {shape}, limits);
    if (!settled.solution.at.solvable) break;
    shape = settled.solution.shapes[0];
    if (plan_fits(settled.plan, shape, y.size())) break;
  }
  return settled;
}

std::optional<Settled> settle_after_gap(std::span<const double> y, const WhiteBlocks& blocks, double reference) {
  std::size_t longest = 0, run = 0, end = 0;
  for (std::size_t k = 0; k < blocks.count; ++k) {
    run = blocks.present[k] != 0 ? 0 : run + 1;
    if (run > longest) {
      longest = run;
      end = (k + 1) * blocks.length;
    }
  }
  if (longest * 50 < blocks.count || y.size() - end < kFewestSamples) return std::nullopt;
  const std::span<const double> after = y.subspan(end);
  const std::optional<Shape> shape = first_shape(after, find_beginning(after));
  if (!shape) return std::nullopt;
  Settled settled = settle(y, *shape, reference);
  if (!settled.solution.converged) return std::nullopt;
  return settled;
}

DampedSine model_of(const Settled& settled) {
  const auto& linear = settled.solution.at.linear;
  const Shape& shape = settled.solution.shapes[0];
  return {shape.a, shape.q, linear[0], linear[1], linear[2] + settled.blocks.reference};
}

}  // namespace coilassay

#include "fitting/damped_sine.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include "fitting/blocks.h"
#include "fitting/damped_sine_search.h"
#include "fitting/damped_sine_start.h"

namespace coilassay {
namespace {

constexpr double kManyCycles = 25;

// Which sums to take for a given shape: blocks so short that nothing is lost, over the part that rings.
struct Plan {
  std::size_t length = 1;
  std::size_t count = 0;
  double omega = 0;          // 0: plain sums
  std::size_t tail_from = 0;  // the number of samples: no tail
};

// The largest length up to `most` that leaves few samples over.
std::size_t good_length(std::size_t span, double most) {
  std::size_t longest = std::max<std::size_t>(1, static_cast<std::size_t>(most));
  std::size_t best = longest;
  for (std::size_t length = longest; length > longest - longest / 8 && length > 0; --length) {
    if (span % length < span % best) best = length;
  }
  return best;
}

Plan with_length(std::size_t samples, std::size_t span, double most_length, double omega) {
  Plan plan;
  plan.omega = omega;
  // Three numbers from fewer than six samples would be no compression: every sample by itself is exact then.
  if (omega != 0 && most_length < 6) {
    most_length = 1;
    plan.omega = 0;
  }
  plan.length = good_length(span, most_length);
  plan.count = span / plan.length;
  plan.tail_from = span < samples ? plan.length * plan.count : samples;
  return plan;
}

// The part of the record where something is left of the oscillation: thirty of its time constants.
std::size_t ringing_part(std::size_t samples, double slow_decay) {
  const double n = static_cast<double>(samples);
  if (slow_decay <= 0 || 30 / slow_decay > 0.9 * n) return samples;
  return std::max<std::size_t>(16, static_cast<std::size_t>(30 / slow_decay));
}

// Loss of variance: (aB)^2 / 3 for demodulated blocks, (lambda B)^2 / 12 and (omega B)^2 / 12 for plain sums.
Plan plan_for(const Shape& shape, double omega_uncertainty, std::size_t samples) {
  const std::size_t span = ringing_part(samples, shape.slow_decay());
  const double length = static_cast<double>(span);
  const double omega = shape.omega();
  if (omega * length > kManyCycles * 2 * std::numbers::pi) {
    double most = length / 512;
    if (shape.a > 0) most = std::min(most, 0.05 / shape.a);
    // The signal must stay inside the band of the blocks.
    if (omega_uncertainty > 0) most = std::min(most, 0.05 / omega_uncertainty);
    return with_length(samples, span, most, omega);
  }
  double most = std::min(length / 256, 0.1 / std::max(shape.fast_decay(), 1e-300));
  if (omega > 0) most = std::min(most, 2 * std::numbers::pi / omega / 64);
  return with_length(samples, span, most, 0);
}

bool good_enough(const Plan& plan, const Shape& shape, std::size_t samples) {
  const std::size_t span = ringing_part(samples, shape.slow_decay());
  const double covered = plan.tail_from < samples ? static_cast<double>(plan.tail_from) : static_cast<double>(samples);
  const double length = static_cast<double>(plan.length);
  if (plan.length * plan.count * 8 < span * 7 && plan.tail_from == samples) return false;
  if (plan.tail_from < samples && covered < 0.7 * static_cast<double>(span)) return false;
  if (plan.length == 1) return true;
  if (plan.omega != 0) return std::abs(shape.omega() - plan.omega) * length < 0.25 && shape.a * length < 0.06;
  return shape.fast_decay() * length < 0.13 && shape.omega() * length < 2 * std::numbers::pi / 50;
}

WhiteBlocks compress(std::span<const double> y, Plan& plan, double reference) {
  for (;;) {
    WhiteBlocks blocks = white_blocks(y, plan.length, plan.count, plan.omega, reference, plan.tail_from);
    // Missing samples cost whole blocks; shorter blocks lose less.
    if (plan.length == 1 || blocks.present_blocks * 10 >= blocks.count * 9) return blocks;
    plan = with_length(y.size(), plan.tail_from < y.size() ? plan.tail_from : y.size(),
                       static_cast<double>(plan.length) / 4, plan.omega);
  }
}

// Shapes worth trying around the strongest line.
std::vector<Shape> starts(const StrongestLine& line) {
  const double length = static_cast<double>(line.length);
  std::vector<Shape> shapes;
  if (line.cycles >= 6) {
    for (const double decay : {0.1, 0.5, 1.26, 3.0, 8.0, 20.0}) {
      for (const double shift : {-0.5, 0.0, 0.5}) {
        const double omega = line.omega + shift * line.omega_error;
        shapes.push_back({decay / length, omega * omega});
      }
    }
    return shapes;
  }
  for (const double decay : {0.15, 0.5, 1.2, 2.5, 5.0, 10.0, 25.0}) {
    const double a = decay / length;
    const double step = 0.7 * std::max(a, std::numbers::pi / (8 * length));
    const double last = line.omega + 7 / length;
    for (double omega = std::max(0.0, line.omega - 7 / length); omega < last; omega += step) {
      shapes.push_back({a, omega * omega});
    }
    for (const double split : {0.5, 0.8, 0.95}) shapes.push_back({a, -a * a * split * split});
  }
  return shapes;
}

Solution<1> first_solution(std::span<const double> y, const StrongestLine& line, double reference,
                           const ShapeLimits& limits, Plan& plan) {
  const double length = static_cast<double>(line.length);
  const bool ringing = line.cycles >= 6;
  const double reach = ringing ? 40 * length : 8 * length;
  const std::size_t span = static_cast<std::size_t>(std::min(reach, static_cast<double>(y.size())));
  plan = with_length(span, span, length / 16, ringing ? line.omega : 0);
  const WhiteBlocks blocks = compress(y.first(span), plan, reference);
  std::vector<std::pair<double, Shape>> scored;
  for (const Shape& shape : starts(line)) {
    if (!limits.allow(shape)) continue;
    const auto at = equations<1>(blocks, {shape}, false);
    if (at.solvable) scored.emplace_back(at.chi_square, shape);
  }
  std::sort(scored.begin(), scored.end(), [](const auto& x, const auto& z) { return x.first < z.first; });
  Solution<1> best;
  const std::size_t tries = ringing ? 1 : 2;
  for (std::size_t i = 0; i < std::min(tries, scored.size()); ++i) {
    Solution<1> solution = refine<1>(blocks, {scored[i].second}, limits);
    if (solution.gain() > best.gain()) best = solution;
  }
  return best;
}

}  // namespace

Result<DampedSineFit> fit_damped_sine(std::span<const double> y, const DampedSineOptions& options) {
  const PresentSum head = present_sum(y.first(std::min<std::size_t>(y.size(), 4096)), 0);
  const std::size_t present = y.size() <= 4096 ? head.count : head.count + present_sum(y.subspan(4096), 0).count;
  if (present < 16) {
    return failure(Problem::too_few_samples, "", fmt::format("only {} samples are present; a fit needs 16", present),
                   "widen the window or sample faster");
  }
  const double reference = head.count > 0 ? head.sum / static_cast<double>(head.count) : 0;
  const StrongestLine line = strongest_line(y);
  const auto nothing = [] {
    return failure(Problem::no_signal, "", "no oscillation stands out of the noise",
                   "check that the window holds the free decay and that the range is not far too coarse");
  };
  if (line.strength <= 0) return nothing();
  const ShapeLimits limits = shape_limits(y.size());
  Plan plan;
  Solution<1> solution = first_solution(y, line, reference, limits, plan);
  if (!solution.at.solvable) return nothing();
  WhiteBlocks blocks;
  for (int round = 0; round < 6; ++round) {
    const Eigen::MatrixXd inverse = inverse_normal<1>(solution.at);
    const double variance = solution.at.chi_square / 100;
    const double omega = solution.shapes[0].omega();
    const double omega_uncertainty = inverse.size() > 0 && omega > 0 ? std::sqrt(inverse(1, 1) * variance) / (2 * omega) : 0;
    plan = plan_for(solution.shapes[0], omega_uncertainty, y.size());
    blocks = compress(y, plan, reference);
    solution = refine<1>(blocks, solution.shapes, limits);
    if (!solution.at.solvable) return nothing();
    if (good_enough(plan, solution.shapes[0], y.size())) break;
  }
  if (!solution.converged) {
    return failure(Problem::not_converged, "",
                   fmt::format("the fit of a damped oscillation did not settle after {} steps", solution.iterations),
                   "narrow the window to the free decay");
  }

  DampedSineFit result;
  const Shape shape = solution.shapes[0];
  const auto linear = solution.at.linear;
  result.model = {shape.a, shape.q, linear[0], linear[1], linear[2] + reference};
  result.cycles = shape.omega() * static_cast<double>(y.size()) / (2 * std::numbers::pi);
  result.block = plan.length;
  result.few_cycles = plan.omega == 0;
  const double values = static_cast<double>(blocks.values_used());
  const double samples = static_cast<double>(blocks.samples());
  result.sigma_in_band = std::sqrt(solution.at.chi_square / std::max(1.0, values - 5));
  // Outside the band of the blocks: the noise there, and what the blocks cannot show of the model itself.
  const double total = blocks.square + blocks.tail_square;
  const double band = blocks.energy + (blocks.tail_count > 0 ? blocks.tail_sum * blocks.tail_sum / static_cast<double>(blocks.tail_count) : 0);
  const double model_outside = model_square<1>(blocks, solution.shapes, linear) - solution.at.model_energy;
  const double outside = std::max(0.0, total - band - model_outside);
  result.sigma_per_sample = std::sqrt((outside + solution.at.chi_square) / std::max(1.0, samples - 5));
  result.sigma = std::max(result.sigma_per_sample, result.sigma_in_band);
  if (std::isfinite(options.resolution)) result.sigma = std::max(result.sigma, options.resolution / std::sqrt(12.0));

  if (solution.gain() < 60 * result.sigma * result.sigma) return nothing();
  result.fit.parameters = Eigen::VectorXd(5);
  result.fit.parameters << shape.a, shape.q, linear[0], linear[1], result.model.c;
  result.fit.covariance = inverse_normal<1>(solution.at) * (result.sigma * result.sigma);
  result.fit.stop = result.fit.covariance.size() > 0 ? FitStop::converged : FitStop::rank_deficient;
  result.fit.iterations = solution.iterations;
  result.fit.residual_rms = result.sigma_per_sample;
  result.fit.reduced_chi_square = solution.at.chi_square / std::max(1.0, values - 5) / (result.sigma * result.sigma);
  result.fit.at_bound.assign(5, false);
  return result;
}

}  // namespace coilassay

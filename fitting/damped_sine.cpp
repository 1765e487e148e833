#include "fitting/damped_sine.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <optional>
#include <vector>

#include "fitting/blocks.h"
#include "fitting/damped_sine_noise.h"
#include "fitting/damped_sine_plan.h"
#include "fitting/damped_sine_search.h"
#include "fitting/damped_sine_start.h"
#include "fitting/rounding.h"

namespace coilassay {
namespace {

constexpr std::size_t kFewest = 16;
// Of what a slow shape explains, what it may leave over in one piece.
constexpr double kMostStructure = 0.004;

Error nothing(std::string finding) {
  return {Problem::no_signal, "", std::move(finding),
          "check that the window holds the free decay and that the range is not far too coarse"};
}

// Solution on blocks that suit it.
struct Settled {
  Solution<1> solution;
  WhiteBlocks blocks;
  Plan plan;
};

// A first fit around the strongest line: of a few dozen shapes the best, then its least squares. Shape per sample of y.
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

// Fits again until the blocks suit the solution they lead to.
Settled settle(std::span<const double> y, const Shape& start, double reference) {
  Settled settled;
  const ShapeLimits limits = shape_limits(y.size());
  Shape shape = start;
  for (int round = 0; round < 6; ++round) {
    double omega_uncertainty = 0;
    if (settled.solution.at.solvable && shape.q > 0) {
      const Eigen::MatrixXd inverse = inverse_normal<1>(settled.solution.at);
      if (inverse.size() > 0) omega_uncertainty = std::sqrt(inverse(1, 1) * settled.solution.variance) / (2 * shape.omega());
    }
    settled.plan = plan_for(shape, omega_uncertainty, y.size());
    settled.blocks = compress(y, settled.plan, reference);
    settled.solution = refine<1>(settled.blocks, {shape}, limits);
    if (!settled.solution.at.solvable) break;
    shape = settled.solution.shapes[0];
    if (plan_fits(settled.plan, shape, y.size())) break;
  }
  return settled;
}

DampedSine model_of(const Settled& settled) {
  const auto& linear = settled.solution.at.linear;
  const Shape& shape = settled.solution.shapes[0];
  return {shape.a, shape.q, linear[0], linear[1], linear[2] + settled.blocks.reference};
}

// Samples until the oscillation has fallen to one step of the converter.
std::size_t samples_above_a_step(const DampedSine& model, double resolution, std::size_t samples) {
  if (model.a <= 0) return samples;
  const double n = static_cast<double>(samples);
  if (model.damped_omega() * n > 2 * std::numbers::pi * 8) {
    const double last = std::log(std::max(model.envelope(0) / resolution, 1.0)) / model.a;
    return static_cast<std::size_t>(std::clamp(last, static_cast<double>(kFewest), n));
  }
  std::size_t last = std::min(kFewest, samples);
  constexpr std::size_t kLooks = 2048;
  for (std::size_t i = 0; i < kLooks; ++i) {
    const std::size_t at = i * samples / kLooks;
    if (std::abs(model(static_cast<double>(at)) - model.c) >= resolution) last = std::max(last, at);
  }
  return last;
}

// What speaks against calling it a decaying oscillation; nothing when nothing does.
std::optional<Error> refusal(const Settled& settled, const DampedSine& model, const NoiseJudgement& noise,
                             std::size_t samples) {
  const double gain = settled.solution.gain(), variance = noise.sigma * noise.sigma;
  // Noise alone gives a gain of 2 ln(N) + 2 x with a probability of a few e^-x, over all frequencies and decays.
  const double threshold = 2 * (std::log(static_cast<double>(samples)) + 14);
  const auto likelihood = [&](double more) { return noise.dof * std::log1p(more / (noise.dof * variance)); };
  if (!(likelihood(gain) > threshold)) return nothing("no oscillation stands out of the noise");
  // With few cycles a wandering level is taken for an oscillation, but leaves more over than a second mode would.
  const double cycles = model.damped_omega() * static_cast<double>(samples) / (2 * std::numbers::pi);
  const bool slow = cycles < 1.5 || model.damped_omega() < 4 * std::abs(model.a);
  if (noise.structure > (slow ? kMostStructure : 0.05) * gain && cycles < 6) {
    return nothing("what is there has a shape that no decaying oscillation has (a step, a pulse or a drift)");
  }
  // Slow shapes look like many things. A drift that a cubic describes as well is no decay.
  if (!slow) return std::nullopt;
  if (settled.plan.omega == 0 && settled.blocks.tail_count == 0) {
    const double left = cubic_chi_square(settled.blocks) - settled.solution.at.chi_square;
    if (!(likelihood(left) > threshold)) return nothing("what is there is a slow drift, not a decaying oscillation");
  }
  // One exponential, half a swing: many decays and frequencies describe it equally well.
  const Eigen::MatrixXd inverse = inverse_normal<1>(settled.solution.at);
  const double product = model.a * model.a + model.q;
  bool told = settled.solution.converged && inverse.size() > 0;
  if (told) {
    const double product_variance = (4 * model.a * model.a * inverse(0, 0) + 4 * model.a * inverse(0, 1) + inverse(1, 1)) * variance;
    told = model.a > 2 * std::sqrt(inverse(0, 0) * variance) && product > 3 * std::sqrt(product_variance);
  }
  if (!told) return nothing("what is there may be one exponential or part of a swing: frequency and decay cannot be told");
  return std::nullopt;
}

}  // namespace

Result<DampedSineFit> fit_damped_sine(std::span<const double> y, const DampedSineOptions& options) {
  const PresentSum head = present_sum(y.first(std::min<std::size_t>(y.size(), 4096)), 0);
  std::size_t present = head.count;
  if (present < kFewest && y.size() > 4096) present += present_sum(y.subspan(4096), 0).count;
  if (present < kFewest) {
    return failure(Problem::too_few_samples, "",
                   fmt::format("only {} samples are present; a fit needs {}", present, kFewest),
                   "widen the window or sample faster");
  }
  const double reference = head.count > 0 ? head.sum / static_cast<double>(head.count) : 0;
  const Beginning beginning = find_beginning(y);
  if (!(beginning.line.strength > 0)) return tl::make_unexpected(nothing("all samples are equal"));
  const std::optional<Shape> start = first_shape(y, beginning);
  if (!start) return tl::make_unexpected(nothing("no oscillation stands out of the noise"));
  Settled settled = settle(y, *start, reference);
  if (!settled.solution.at.solvable) return tl::make_unexpected(nothing("no oscillation stands out of the noise"));

  DampedSineFit result;
  result.model = model_of(settled);
  NoiseJudgement noise = judge_noise(y, settled.blocks, settled.solution, result.model);
  if (auto error = refusal(settled, result.model, noise, y.size())) return tl::make_unexpected(*error);
  if (!settled.solution.converged) {
    return failure(Problem::not_converged, "",
                   fmt::format("the fit of a damped oscillation did not settle after {} steps",
                               settled.solution.iterations),
                   "narrow the window to the free decay");
  }
  const double step = options.resolution;
  std::size_t span = y.size();
  result.undithered = std::isfinite(step) && noise.per_sample < 0.45 * step;
  if (result.undithered) {
    span = samples_above_a_step(result.model, step, y.size());
    if (span < y.size() - y.size() / 20) {
      Settled shorter = settle(y.first(span), settled.solution.shapes[0], reference);
      if (shorter.solution.converged) {
        settled = std::move(shorter);
        result.model = model_of(settled);
        noise = judge_noise(y.first(span), settled.blocks, settled.solution, result.model);
      } else {
        span = y.size();
      }
    } else {
      span = y.size();
    }
  }
  const Shape shape = settled.solution.shapes[0];
  result.samples = span;
  result.cycles = shape.omega() * static_cast<double>(y.size()) / (2 * std::numbers::pi);
  result.block = settled.plan.length;
  result.few_cycles = settled.plan.omega == 0;
  result.sigma_per_sample = noise.per_sample;
  result.sigma_in_band = noise.in_band;
  result.sigma = noise.sigma;
  result.dof = noise.dof;
  Eigen::MatrixXd& covariance = result.fit.covariance;
  const Eigen::MatrixXd inverse = inverse_normal<1>(settled.solution.at);
  if (inverse.size() > 0) {
    const double scatter = noise.per_sample * noise.per_sample;
    const double own = std::sqrt(std::max(scatter - step * step / 12, 1e-4 * step * step));
    if (rounding_matters(span, step, own)) {
      const RoundingError rounding = rounding_error(result.model, span, step, own, inverse);
      if (result.undithered) result.sigma = std::sqrt(std::max(scatter - rounding.mean_square, own * own));
      covariance = rounding.covariance + inverse * (result.sigma * result.sigma);
    } else {
      covariance = inverse * (noise.sigma * noise.sigma);
    }
  }
  const DampedSine& model = result.model;
  result.fit.parameters = Eigen::VectorXd(5);
  result.fit.parameters << model.a, model.q, model.p, model.s, model.c;
  result.fit.stop = covariance.size() > 0 ? FitStop::converged : FitStop::rank_deficient;
  result.fit.iterations = settled.solution.iterations;
  result.fit.residual_rms = noise.per_sample;
  const double values = static_cast<double>(settled.blocks.values_used());
  result.fit.reduced_chi_square =
      settled.solution.at.chi_square / std::max(1.0, values - 5) / (result.sigma * result.sigma);
  result.fit.at_bound.assign(5, false);
  return result;
}

}  // namespace coilassay

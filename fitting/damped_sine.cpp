#include "fitting/damped_sine.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <optional>
#include <utility>

#include "fitting/blocks.h"
#include "fitting/damped_sine_noise.h"
#include "fitting/damped_sine_settle.h"
#include "fitting/rounding.h"

namespace coilassay {
namespace {

// Scatter of single samples, in steps, below which rounding errs by the signal and not by chance: 0.29 is rounding
// alone, 0.45 comes from noise of 0.34 steps before rounding.
constexpr double kUndithered = 0.45;
// Of what a slow shape explains, what it may leave over in one piece.
constexpr double kMostStructure = 0.004;

Error nothing(std::string finding) {
  return {Problem::no_signal, "", std::move(finding),
          "check that the window holds the free decay and that the range is not far too coarse"};
}

// Samples until the oscillation has fallen to one step of the converter.
std::size_t samples_above_a_step(const DampedSine& model, double resolution, std::size_t samples) {
  if (model.a <= 0) return samples;
  const double n = static_cast<double>(samples);
  if (model.damped_omega() * n > 2 * std::numbers::pi * 8) {
    const double last = std::log(std::max(model.envelope(0) / resolution, 1.0)) / model.a;
    return static_cast<std::size_t>(std::clamp(last, static_cast<double>(kFewestSamples), n));
  }
  std::size_t last = std::min(kFewestSamples, samples);
  constexpr std::size_t kLooks = 2048;
  for (std::size_t i = 0; i < kLooks; ++i) {
    const std::size_t at = i * samples / kLooks;
    if (std::abs(model(static_cast<double>(at)) - model.c) >= resolution) last = std::max(last, at);
  }
  return last;
}

// What speaks against calling it a decaying oscillation; nothing when nothing does.
std::optional<Error> refusal(const Settled& settled, const DampedSine& model, const NoiseJudgement& noise,
                             std::size_t samples, double resolution) {
  const double gain = settled.solution.gain(), variance = noise.sigma * noise.sigma;
  // Noise alone gives a gain of 2 ln(N) + 2 x with a probability of a few e^-x, over all frequencies and decays.
  const double threshold = 2 * (std::log(static_cast<double>(samples)) + 14);
  const auto likelihood = [&](double more) { return noise.dof * std::log1p(more / (noise.dof * variance)); };
  if (!(likelihood(gain) > threshold)) return nothing("no oscillation stands out of the noise");
  // With few cycles a wandering level is taken for an oscillation, but leaves more over than a second mode would.
  const double cycles = model.damped_omega() * static_cast<double>(samples) / (2 * std::numbers::pi);
  const bool slow = cycles < 1.5 || model.damped_omega() < 4 * std::abs(model.a);
  // Rounding to coarse steps hangs together as well; it leaves at most a quarter of a squared step per sample.
  const double rounding = resolution > 0 ? resolution * resolution / 4 * static_cast<double>(samples) : 0;
  if (noise.structure > (slow ? kMostStructure : 0.05) * gain + rounding && cycles < 6) {
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
    const double product_variance =
        (4 * model.a * model.a * inverse(0, 0) + 4 * model.a * inverse(0, 1) + inverse(1, 1)) * variance;
    told = model.a > 2 * std::sqrt(inverse(0, 0) * variance) && product > 3 * std::sqrt(product_variance);
  }
  if (!told)
    return nothing("what is there may be one exponential or part of a swing: frequency and decay cannot be told");
  return std::nullopt;
}

// The solution with its noise judged and its covariance made; span: the samples it was fitted to.
DampedSineFit conclude(const Settled& settled, const NoiseJudgement& noise, std::size_t span, double resolution,
                       bool undithered) {
  DampedSineFit result;
  result.model = model_of(settled);
  result.samples = span;
  result.undithered = undithered;
  result.cycles = result.model.damped_omega() * static_cast<double>(span) / (2 * std::numbers::pi);
  result.block = settled.plan.length;
  result.few_cycles = settled.plan.omega == 0;
  result.sigma_per_sample = noise.per_sample;
  result.sigma_in_band = noise.in_band;
  result.sigma = noise.sigma;
  result.dof = noise.dof;
  const Eigen::MatrixXd inverse = inverse_normal<1>(settled.solution.at);
  if (inverse.size() > 0) {
    result.fit.covariance = Eigen::MatrixXd::Zero(5, 5);
    const double scatter = noise.per_sample * noise.per_sample;
    // The noise before rounding: what single samples show less the variance of rounding itself.
    const double own = std::sqrt(std::max(scatter - resolution * resolution / 12, 1e-4 * resolution * resolution));
    if (rounding_matters(span, resolution, own)) {
      const RoundingError rounding = rounding_error(result.model, span, resolution, own, inverse);
      if (undithered) result.sigma = std::sqrt(std::max(scatter - rounding.mean_square, own * own));
      result.fit.covariance += rounding.covariance;
    }
    result.fit.covariance += inverse * (result.sigma * result.sigma);
  }
  const DampedSine& model = result.model;
  result.fit.parameters = Eigen::VectorXd(5);
  result.fit.parameters << model.a, model.q, model.p, model.s, model.c;
  result.fit.stop = inverse.size() > 0 ? FitStop::converged : FitStop::rank_deficient;
  result.fit.iterations = settled.solution.iterations;
  result.fit.residual_rms = noise.per_sample;
  result.fit.reduced_chi_square = noise.in_band * noise.in_band / (result.sigma * result.sigma);
  result.fit.at_bound.assign(5, false);
  return result;
}

}  // namespace

Result<DampedSineFit> fit_damped_sine(std::span<const double> y, const DampedSineOptions& options) {
  const PresentSum head = present_sum(y.first(std::min<std::size_t>(y.size(), 4096)), 0);
  std::size_t present = head.count;
  if (present < kFewestSamples && y.size() > 4096) present += present_sum(y.subspan(4096), 0).count;
  if (present < kFewestSamples) {
    return failure(Problem::too_few_samples, "",
                   fmt::format("only {} samples are present; a fit needs {}", present, kFewestSamples),
                   "widen the window or sample faster");
  }
  const double reference = head.count > 0 ? head.sum / static_cast<double>(head.count) : 0;
  Beginning beginning =
      options.near_omega > 0 ? beginning_near(y, options.near_omega, reference) : find_beginning(y, reference);
  if (!(beginning.line.strength > 0)) return tl::make_unexpected(nothing("all samples are equal"));
  const std::optional<Shape> start = first_shape(y, beginning);
  if (!start) return tl::make_unexpected(nothing("no oscillation stands out of the noise"));
  Settled settled = settle(y, *start, reference, std::move(beginning.sums));
  if (!settled.solution.at.solvable) return tl::make_unexpected(nothing("no oscillation stands out of the noise"));
  NoiseJudgement noise = judge_noise(y, settled.blocks, settled.solution, model_of(settled));
  if (auto other = settle_after_gap(y, settled.blocks, reference)) {
    const NoiseJudgement judged = judge_noise(y, other->blocks, other->solution, model_of(*other));
    if (judged.per_sample < noise.per_sample) {
      settled = std::move(*other);
      noise = judged;
    }
  }
  if (auto error = refusal(settled, model_of(settled), noise, y.size(), options.resolution)) {
    // The frequency that was given may be wrong; the record itself is asked before it is refused.
    if (options.near_omega > 0) return fit_damped_sine(y, {.resolution = options.resolution});
    return tl::make_unexpected(*error);
  }
  if (!settled.solution.converged) {
    return failure(
        Problem::not_converged, "",
        fmt::format("the fit of a damped oscillation did not settle after {} steps", settled.solution.iterations),
        "narrow the window to the free decay");
  }
  const double step = options.resolution;
  const bool undithered = step > 0 && noise.per_sample < kUndithered * step;
  std::size_t span = y.size();
  const std::size_t above = undithered ? samples_above_a_step(model_of(settled), step, y.size()) : y.size();
  if (above < y.size() - y.size() / 20) {
    Settled shorter = settle(y.first(above), settled.solution.shapes[0], reference);
    if (shorter.solution.converged) {
      settled = std::move(shorter);
      span = above;
      noise = judge_noise(y.first(span), settled.blocks, settled.solution, model_of(settled));
    }
  }
  return conclude(settled, noise, span, step, undithered);
}

}  // namespace coilassay

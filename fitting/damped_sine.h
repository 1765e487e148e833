// y_n = e^{-a n} (p C_q(n) + s S_q(n)) + c, fitted in one pass over the samples.
#pragma once

#include <cmath>
#include <cstddef>
#include <span>

#include "base/result.h"
#include "fitting/fit.h"

namespace coilassay {

/// Damped oscillation in units of the sample index n, n = 0 at the first sample of the span that was fitted.
///
/// C_q(n) = cos(n sqrt q), S_q(n) = sin(n sqrt q)/sqrt q; for q < 0 cosh and sinh, so that nothing happens at critical
/// damping. y(0) = p + c; slope of the oscillating part at 0 is s - a p.
struct DampedSine {
  double a = 0;  // decay per sample
  double q = 0;  // (rad per sample)^2; negative when overdamped
  double p = 0;
  double s = 0;
  double c = 0;

  double natural_omega() const { return std::sqrt(a * a + q); }     // rad per sample
  double damped_omega() const { return q > 0 ? std::sqrt(q) : 0; }  // rad per sample
  double quality() const { return natural_omega() / (2 * a); }
  /// Envelope at n: e^{-an} sqrt(p^2 + s^2/q); needs q > 0.
  double envelope(double n) const { return std::exp(-a * n) * std::sqrt(p * p + s * s / q); }
  double operator()(double n) const;
};

/// The model at first_n, first_n + 1, ...: by recurrence, within 2e-12 of the amplitude for n up to 1e7.
void evaluate(const DampedSine& model, double first_n, std::span<double> out);

struct DampedSineOptions {
  double resolution = std::nan("");  // step between codes, in units of y; NaN: not quantised or not known
  double near_omega = std::nan("");  // frequency to begin at, rad per sample; NaN, or wrong: found from the record
};

struct DampedSineFit {
  Fit fit;  // parameters in the order a, q, p, s, c; n from the first sample of the span
  DampedSine model;
  double sigma_per_sample = std::nan("");  // scatter of single samples about the model
  double sigma_in_band = std::nan("");     // scatter seen by the compressed data, expressed per sample
  double sigma = std::nan("");             // what the covariance uses; rounding is added to it, see fit_damped_sine
  double dof = 0;                          // degrees of freedom of sigma: the t quantile matters for short records
  std::size_t samples = 0;  // used, from the first: fewer than given where an undithered tail is left out
  bool undithered = false;  // noise below about 0.3 of the resolution: see fit_damped_sine
  double cycles = 0;        // in the span
  std::size_t block = 1;    // samples per block
  bool few_cycles = false;  // block means in (a, q) instead of demodulated blocks
};

/// Fits one damped sine to evenly spaced samples (NaN = missing; blocks that hold one are left out, and made shorter
/// where that would cost much).
///
/// Statistically as good as a fit of every sample (variance within 1 % of the Cramer-Rao bound); cost is one read of
/// the array. Q from 0.35 up, overdamped included; a may come out at or below 0 when the record is too short to show
/// decay.
///
/// Noise. The covariance is (J^T J)^-1 sigma^2; sigma is the scatter of single samples, or the in-band scatter where
/// that is larger beyond chance. It holds for short records with the t quantile of `dof`. With a `resolution` it also
/// holds what rounding does: when the noise does not dither the converter (`undithered`: below about 0.34 of a step)
/// rounding errs by a function of the signal, so the fit stops where the oscillation has fallen to one step
/// (`samples`), and the mean square of that error over the unknown position of the levels is added. A larger sigma
/// alone would not do: the error pushes single parameters, by up to 8 times more or less than white noise of that size.
///
/// @return too_few_samples (fewer than 16 present);
///         no_signal: nothing above the noise (false alarms on white noise below 1e-4), a slow drift (a cubic describes
///         it as well), a step or pulse (with few cycles: what is left over hangs together and exceeds 0.4 % of the
///         fit), or one exponential or part of a swing (frequency and decay cannot be told); not_converged.
Result<DampedSineFit> fit_damped_sine(std::span<const double> y, const DampedSineOptions& options = {});

/// Two modes on one offset; parameters a1, q1, p1, s1, a2, q2, p2, s2, c. The first is the larger at n = 0.
///
/// For modes as close as one decay rate in angular frequency; far ones are found in what the first leaves over.
struct TwoModeFit {
  Fit fit;
  DampedSine first, second;  // c stands in the first
  double sigma = std::nan("");
  /// Chi-square the second mode takes away, in units of sigma^2 (large: it is really there).
  double gain = 0;
};
/// @return what fit_damped_sine returns, or not_converged: no second oscillation could be told apart.
Result<TwoModeFit> fit_two_damped_sines(std::span<const double> y, const DampedSineOptions& options = {});

/// Standard uncertainties by the Cramer-Rao bound for given truth and noise, same order as the parameters (5 values).
Eigen::VectorXd damped_sine_bound(const DampedSine& truth, std::size_t samples, double sigma);

}  // namespace coilassay

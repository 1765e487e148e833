// What a converter without dither does to a damped sine. Internal to this room.
#pragma once

#include <Eigen/Core>
#include <cstddef>
#include <vector>

#include "fitting/damped_sine.h"

namespace coilassay {

/// Mean error of rounding to whole steps, d(m) = E[round(m + e)] - m for normal noise e, and its antiderivative.
///
/// d is periodic and odd: sum of (-1)^k e^{-2 pi^2 k^2 noise^2} sin(2 pi k m) / (pi k); with noise above half a step it
/// fades (0.2 % of a step), without noise it is the sawtooth round(m) - m.
class MeanRounding {
 public:
  explicit MeanRounding(double noise_in_steps);
  double at(double level) const;
  /// Mean of d over the levels between two, taken evenly.
  double mean(double from, double to) const;

 private:
  double integral(double level) const;  // from 0; periodic because d has no mean
  std::vector<double> value_, integral_;
};

struct RoundingError {
  Eigen::MatrixXd covariance;  // of a, q, p, s, c
  double mean_square = 0;      // of d over the span: part of the scatter of single samples
};

/// The covariance that rounding to steps of `resolution` adds when noise of standard deviation `noise` does not dither
/// it.
///
/// Rounding then errs by a function of the signal, which pushes the parameters by (J^T J)^-1 sum J^T d. Where the
/// levels lie between the steps is not known, so the push is averaged over offsets and amplitudes within one step, on
/// fixed points. Long records are looked at in at most 10^5 places, with d averaged over the levels in between.
/// @param inverse  (J^T J)^-1 of the fit, J for all samples of the span
RoundingError rounding_error(const DampedSine& model, std::size_t samples, double resolution, double noise,
                             const Eigen::MatrixXd& inverse);

/// Whether it can matter: the largest mean error against a tenth of what `samples` of noise leave of a mean.
bool rounding_matters(std::size_t samples, double resolution, double noise);

}  // namespace coilassay

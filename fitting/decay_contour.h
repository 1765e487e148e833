// The region of decay and frequency that the data allow, where it is not an ellipse.
#pragma once

#include <Eigen/Core>
#include <span>
#include <vector>

#include "fitting/damped_sine.h"

namespace coilassay {

/// A point (a, q) of a contour, per sample and (rad per sample)^2.
struct DecayPoint {
  double a = 0, q = 0;
};

struct DecayContour {
  std::vector<DecayPoint> points;   // empty when the fit has no covariance or is undithered
  /// The region reaches a^2 + q -> infinity: the data see one decaying exponential, and of the natural frequency only a
  /// lower limit.
  bool open = false;
};

/// Points around the best (a, q) at which chi-square has risen by `rise`, all other parameters at their best there.
///
/// The range of any function of (a, q) over the contour is its profile-likelihood interval (rise 3.84: 95 %). Near critical
/// damping the region is far from the ellipse of the covariance; it is nearly one in the coefficients of 1 + T s + P s^2,
/// T = 2a/(a^2 + q) and P = 1/(a^2 + q), so it is walked outwards along straight lines in those.
/// @param y    the samples that were fitted; fewer than about 25 cycles (block means are used)
/// @param fit  of the same samples; its sigma and covariance set the scale
DecayContour decay_contour(std::span<const double> y, const DampedSineFit& fit, double rise = 3.841, int directions = 32);

}  // namespace coilassay

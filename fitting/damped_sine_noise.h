// What the residuals of a damped sine say about its noise. Internal to this room.
#pragma once

#include <Eigen/Core>
#include <span>

#include "fitting/damped_sine.h"
#include "fitting/damped_sine_search.h"

namespace coilassay {

struct NoiseJudgement {
  double per_sample = 0;  // scatter of single samples about the model
  double in_band = 0;     // the same by the white block values
  double sigma = 0;       // per_sample, or in_band where that is larger beyond chance
  double dof = 0;         // of sigma
};

/// @param model  with its offset, in units of y
NoiseJudgement judge_noise(std::span<const double> y, const WhiteBlocks& blocks, const Solution<1>& solution,
                           const DampedSine& model);

/// Number of polynomial degrees of freedom a slow drift may have before it is called ringing: chi-square of the best cubic
/// through the white values. Only for plain sums without a tail.
double cubic_chi_square(const WhiteBlocks& blocks);

/// Covariance of (a, q, p, s, c) that rounding to steps of `resolution` adds when the noise does not dither the converter.
///
/// Rounding then errs by a known function of the signal: for noise of standard deviation `noise` its mean at a level m is
/// d(m) = E[round(m + e)] - m, which pushes the parameters by H^-1 sum J^T d. Where the levels fall between the steps is
/// not known, so the push is averaged over offsets and amplitudes within one step (fixed points, no random numbers).
/// @param inverse        (J^T J)^-1 of the fit
/// @param mean_square    filled with the mean of d^2 over the span: already inside the scatter of single samples
Eigen::MatrixXd rounding_covariance(const DampedSine& model, std::size_t samples, double resolution, double noise,
                                    const Eigen::MatrixXd& inverse, double& mean_square);

}  // namespace coilassay

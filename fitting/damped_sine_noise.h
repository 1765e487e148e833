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
  double structure = 0;   // part of the residual chi-square that hangs together from block to block
};

/// @param model  with its offset, in units of y
NoiseJudgement judge_noise(std::span<const double> y, const WhiteBlocks& blocks, const Solution<1>& solution,
                           const DampedSine& model);

/// Chi-square of the best cubic through the white values: what a slow drift would explain. Only for plain sums without
/// a tail.
double cubic_chi_square(const WhiteBlocks& blocks);

}  // namespace coilassay

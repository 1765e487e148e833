// Does one damped sine really describe this stretch? Looked at on a few thousand samples, whatever the record's length.
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "fitting/damped_sine.h"

namespace coilassay {

struct DecayResiduals {
  double sigma = 0;              // scatter out of band, in units of y: noise, whatever the misfit does
  double lack_of_fit = 0;        // in-band variance of the residuals over that noise; near 1 when the model fits
  double chance = 1;             // probability of a larger ratio by chance
  double misfit_amplitude = 0;   // r.m.s. amplitude of what is left in band beyond the noise, in units of y
  double early_z = 0;            // strongest sign of a fast exponential at the start, in standard deviations
  std::size_t bad_head = 0;      // samples up to the last outlier among the first ones
  std::vector<std::size_t> position;   // of each stretch looked at, samples from the start of the window
  std::vector<double> energy;          // in-band variance in each, relative to the noise
};

/// Residuals of `model` (n = 0 at y[0]) on evenly spaced stretches. In each stretch the residuals are projected on a
/// constant and a sine of the model's frequency (few cycles: on a constant and a slope); what lies in these directions is
/// misfit plus noise, what lies outside is noise alone, so the ratio follows the F law when the model is right.
/// @param resolution  step between codes; misfit below a third of it is the quantiser's own and is not counted
DecayResiduals look_at_residuals(std::span<const double> y, const DampedSine& model, double resolution);

}  // namespace coilassay

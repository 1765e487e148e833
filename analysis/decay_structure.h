// When one damped sine does not describe a decay: what is there instead, and how far it moves the answer.
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "analysis/decay_window.h"
#include "base/finding.h"
#include "fitting/damped_sine.h"

namespace coilassay {

/// The decay as seen by one of several consecutive windows.
struct DecayWindowPoint {
  double amplitude;      // envelope in the middle, units of y
  double a, u_a, q, u_q; // per sample
};

struct DecayStructure {
  std::optional<TwoModeFit> modes;          // when a second mode explains the misfit
  double second_share = 0;                  // its amplitude over the first's, at the start of the window
  std::vector<DecayWindowPoint> windows;    // when decay or frequency change along the record
  double spread_a = 0, spread_q = 0;        // half-widths that cover what was seen, per sample
  std::vector<Finding> findings;            // second_mode, level_dependent, not_one_exponential
};

/// Looks for a spectral line in the residuals and, where the residuals are not noise, for a second mode or for a decay
/// that changes with its amplitude. Costs one short transform when all is well.
DecayStructure look_at_structure(std::span<const double> window, const Decay& decay, double resolution,
                                 double sample_interval_s);

}  // namespace coilassay

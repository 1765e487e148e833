// Where in a record the free decay stands: after the release, after any start transient, before it is lost or disturbed.
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "analysis/decay_residuals.h"
#include "base/finding.h"
#include "base/result.h"
#include "fitting/damped_sine.h"

namespace coilassay {

struct DecaySearch {
  double resolution = std::nan("");            // step between codes of y
  std::span<const double> drive;               // a channel that shows the drive; may be empty
  double near_omega = std::nan("");            // frequency to begin at, rad per sample, when it is known
  std::optional<std::size_t> from, to;         // stated window [from, to); searching stops at what is stated
};

/// A free decay found in a record, with the fit of it.
struct Decay {
  std::size_t first = 0, end = 0;              // window [first, end) in samples of the record
  DampedSineFit fit;                           // n = 0 at `first`
  DecayResiduals residuals;
  bool drive_before = false;                   // something other than rest or free decay stands before the window
  bool retriggered = false;                    // a second burst ended the window
  std::size_t skipped = 0;                     // samples left out after the release because of a start transient
  double start_shift_a = 0, start_shift_q = 0; // how far a and q moved with the last change of the start
};

/// Finds the release (from the drive channel, else from the record), skips a start transient only as far as the data
/// show one, stops where the envelope of an undithered record falls to one code, and fits what lies between.
///
/// Search: the first samples that leave rest are tried as the release; where the fit does not describe them, a later
/// stretch that is surely free is fitted and carried backwards until the record leaves the prediction.
/// @return no_signal when nothing rings above the noise; too_few_samples.
Result<Decay> find_decay(std::span<const double> y, const DecaySearch& search);

}  // namespace coilassay

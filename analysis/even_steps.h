// A record on even time steps, which the fits need.
#pragma once

#include <string>
#include <vector>

#include "acquire/capture.h"
#include "base/finding.h"
#include "base/result.h"

namespace coilassay {

/// Time base of a capture on even steps and, when its own steps are uneven, its channels resampled onto them.
struct EvenRecord {
  double start_s = 0;             // 0 when the origin is not known
  double step_s = 0;
  std::vector<double> samples;    // empty when the channel could be used as it is
  std::vector<Finding> findings;  // uneven_step when it was resampled
};

/// The channel on even steps. Uneven records (simulators choose their own steps) are resampled at their median step by a
/// cubic through the four nearest samples; a finding says so. usage when the file gives no time at all.
Result<EvenRecord> on_even_steps(const Capture& capture, std::size_t channel);

}  // namespace coilassay

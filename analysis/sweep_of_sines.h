// A sweep made by hand: many captures of a steady sine, each at its own frequency.
#pragma once

#include <string>
#include <vector>

#include "acquire/capture.h"
#include "analysis/sine.h"
#include "analysis/sweep.h"
#include "base/result.h"

namespace coilassay {

struct SweepOfSines {
  Sweep sweep;                      // one port, by the order of the captures; as_read "sine"
  SweepKnowledge knowledge;         // noise of each point, and the errors of the bench they share
  std::vector<SourceRecord> sources;
};

/// Measures each capture as measure_sine() does. A capture without a common sine is a bad point, with a finding of its own.
/// What is the same at every frequency (gains, shunt, skew) moves all points together; what is not (noise, rounding) is theirs alone.
/// @return what measure_sine() refuses.
Result<SweepOfSines> sweep_of_sines(const std::vector<Capture>& captures, const SineRequest& request);

}  // namespace coilassay

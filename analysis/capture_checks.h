// What can be seen in the samples of one channel before any model: clipping, range, missing samples.
#pragma once

#include <cstddef>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "base/finding.h"

namespace coilassay {

/// A stretch of equal extreme samples [first, end).
struct FlatTop {
  std::size_t first, end;
};

/// Flat tops of a waveform: three or more equal samples at the largest or smallest value whose flanks are too steep for a
/// natural crest, or any such run at the stated full scale. The crest of a slow wave on a coarse converter is flat
/// too: it is told apart by its curvature, taken from the flanks.
std::vector<FlatTop> find_flat_tops(const Channel& channel, std::size_t first, std::size_t end);

/// Finding `coarse_range` when the span between the extremes of [first, end) uses few codes of the converter.
std::vector<Finding> check_range(const Channel& channel, std::size_t first, std::size_t end);

}  // namespace coilassay

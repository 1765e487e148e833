// Shapes of voltage and current that tell a driven test from another, seen roughly.
#pragma once

#include <cstddef>
#include <span>

#include "acquire/capture.h"

namespace coilassay {

/// Places among the channels of a capture.
struct DrivenPair {
  std::size_t voltage = 0, current = 0;
};

/// The current rises steadily from (nearly) zero to its peak, or from peak to peak through zero, while the voltage
/// keeps its sign. Averages over up to 256 blocks are looked at, so noise and a knee do not matter.
bool current_ramps(const Capture& capture, DrivenPair pair);

/// A list of readings in which the voltage is proportional to the current, but for an offset: 2 to 1000 rows, no even
/// time or few rows, the current of more than one value.
bool voltage_follows_current(const Capture& capture, DrivenPair pair);

/// The swing about the mean is as large at the end of the record as at the beginning, within a fifth.
bool is_level(std::span<const double> samples);

}  // namespace coilassay

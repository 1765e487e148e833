// Cautions about people and equipment, computed from the user's own input (docs/cautions.md).
#pragma once

#include <vector>

#include "analysis/measurement.h"

namespace coilassay {

/// Energy in the coil and voltage across it at the release of a ring-down.
///
/// Thresholds: energy note from the first, caution from 50 mJ, stop from 1 J (from memory); 42 V peak is the usual limit
/// for touchable parts (from memory). The energy is always stated, as a note when it is small.
std::vector<Caution> ring_down_cautions(double peak_voltage_v, double peak_current_a, double energy_j);

}  // namespace coilassay

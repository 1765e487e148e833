// Cautions about people and equipment, computed from the user's own input (docs/cautions.md).
#pragma once

#include <cmath>
#include <string>
#include <vector>

#include "analysis/measurement.h"

namespace coilassay {

/// Energy in the coil and voltage across it at the release of a ring-down, or at the start of the window where that is the
/// first that is known. NaN energy: not known, and left out.
///
/// Thresholds: energy note from the first, caution from 50 mJ, a stronger one from 1 J (from memory); 42 V peak is the usual
/// limit for touchable parts (from memory). A known energy is always stated, as a note when it is small.
std::vector<Caution> ring_down_cautions(double peak_voltage_v, double peak_current_a, double energy_j, bool at_release);

/// What one pulse of a saturation test does.
struct RampLoad {
  double peak_a = 0, energy_j = 0, inductance_h = 0;
  bool fall_seen = false;            // the current was seen to fall through a diode
  double winding_j = 0;              // heat of one pulse in the winding ...
  bool winding_assumed = false;      // ... by a resistance nobody stated
  double shunt_j = std::nan("");     // in the shunt; NaN: none stated
  double period_s = std::nan("");    // of repeated pulses; NaN: one
  bool shares_earth = false;         // shunt and coil on inputs of one earth, nothing subtracted
};
/// Energy at the peak current, flyback without a clamp (I sqrt(L/C) into an assumed 100 pF), heat per pulse and by
/// repetition, where the shunt must sit on an earthed scope.
std::vector<Caution> ramp_cautions(const RampLoad& load);

/// What a steady sine does to coil and bench; peak values.
struct SineLoad {
  double peak_v = 0, peak_a = 0;
  double energy_j = std::nan("");    // at the crest of the current; NaN: inductance not known
  double shunt_w = std::nan("");     // mean power in the shunt; NaN: none
  bool shares_earth = false;         // shunt and coil on inputs of one earth, nothing subtracted
};
/// Energy at the crest, voltage, heat of the shunt, and where the shunt must sit on an earthed scope.
std::vector<Caution> sine_cautions(const SineLoad& load);

/// What stands at the open one of two windings.
struct StepUp {
  double ratio = 0;                  // of its voltage to that across the driven one
  double test_v = std::nan("");      // peak across the driven one; NaN: not known
  std::string open_side;             // "secondary"
};
/// Voltage at the open side above 42 V peak, or the test voltage from which on it is, where the ratio is above 3.
std::vector<Caution> coupling_cautions(const StepUp& step);

}  // namespace coilassay

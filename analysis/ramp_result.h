// Pieces of a ramp's result: estimates, the curve, cautions, findings, traces.
#pragma once

#include <vector>

#include "analysis/measurement.h"
#include "analysis/ramp.h"
#include "analysis/ramp_curve.h"
#include "analysis/ramp_flux.h"
#include "analysis/ramp_pulses.h"

namespace coilassay {

/// Everything one ramp record gave, before it is put into words.
struct RampStory {
  const DrivenRecord* record = nullptr;
  const RampRequest* request = nullptr;
  RampLayout layout;
  std::vector<PulseIntegrals> integrals;   // one per pulse
  RampResistance resistance;
  RampInputs inputs;
  std::vector<RampCurve> curves;           // one per pulse
  /// First of the pulses that stand for the coil: the first pulse of several is kept apart.
  std::size_t first_counted() const { return curves.size() > 1 ? 1 : 0; }
  /// The curve that is shown.
  const RampCurve& shown() const { return curves[first_counted()]; }
};

/// Whether the current slows down although the flux goes on, so that no knee may be read from it.
bool knee_is_refused(const RampStory& story);

/// L_0, I_sat_*, E_max, R_dc, W_loop with their budgets; bounds of what was not reached.
void add_ramp_estimates(Measurement& result, const RampStory& story);
void add_loop(Measurement& result, const RampStory& story);

/// The table `curve`, with the expanded uncertainty of the incremental inductance.
void add_ramp_curve(Measurement& result, const RampStory& story);
/// One row per pulse when there are several.
void add_ramp_pulses(Measurement& result, const RampStory& story);
void add_ramp_findings(Measurement& result, const RampStory& story);
void add_ramp_cautions(Measurement& result, const RampStory& story);
void add_ramp_traces(Measurement& result, const RampLayout& layout, const RampStory* story);

}  // namespace coilassay

// A coil's equivalent circuit from impedance against frequency.
#pragma once

#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "analysis/budget.h"
#include "analysis/impedance_errors.h"
#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

/// What whoever made the sweep from something else (a fixture's correction, captured waveforms) knows of its errors.
struct SweepKnowledge {
  std::vector<Correction> corrections;        // already made to the impedances
  std::vector<ImpedanceErrorTerm> errors;     // each with one dz_ohm per point of the sweep
  /// Random errors of each point: of ln |Z| and of the angle in radians. Empty: found from the residuals.
  std::vector<double> u_ratio, u_phase;
  bool complete = false;                      // `errors` holds every error there is: no accuracy of an analyser comes on top
};

struct SweepRequest {
  BenchSetup bench;                     // impedance: accuracy of the analyser; timebase: of its frequency
  SweepKnowledge knowledge;
  std::vector<double> at_hz;            // frequencies at which apparent values are wanted
  PropagationOptions propagation;
  bool traces = false;                  // add what a figure needs: trace_sweep, trace_model, trace_causality
};

/// L, R_dc, R_ac, C_par, R_par and f_r of one port; a point for each frequency asked for, by the model and by the nearest data.
///
/// Model (docs/formulas.md#sweep): the circuit the data ask for out of several, fitted to ln Z, or to S where the file holds S
/// and its errors are alike there. Elements that the data do not show stand in `bounds`. An f_r outside the span does
/// too, with finding span_misses_resonance. Errors common to all points (accuracy of the analyser, its frequency, the
/// fixture) are carried through the fit by its own sensitivities. A sweep in which no inductance can be seen, whose
/// resistance is negative throughout or whose angles are in the wrong unit gives a Measurement without L whose findings
/// say why.
/// @return too_few_samples: fewer than 5 usable points, or all at one frequency; usage: more than one port.
Result<Measurement> measure_sweep(const Sweep& sweep, const SweepRequest& request);

}  // namespace coilassay

// Quantities, bounds and points of a fitted sweep, and what is noticed about them. Internal to this room.
#pragma once

#include "analysis/measurement.h"
#include "analysis/sweep_model.h"

namespace coilassay {

/// L, R_dc, R_ac, C_par, R_par, f_r with their budgets; bounds for elements the data do not show.
void add_circuit(Measurement& result, const SweepModel& model, const SweepData& data, const SweepRequest& request);

/// Z, phi, L_s, R_s, L_p, R_p, Q and D at each frequency asked for: by the model, then of the nearest point.
void add_points(Measurement& result, const SweepModel& model, const SweepData& data, const SweepRequest& request);

/// Family, elements by name, runner-up, left out points, quality of the fit.
ModelSummary model_of(const SweepModel& model, const SweepData& data);

/// Traces for a figure: trace_sweep, trace_model, trace_causality.
void add_sweep_traces(Measurement& result, const SweepModel& model, const SweepData& data);

/// What can be said before any fit: angles in the wrong unit, resistance that is negative throughout, reactance that is
/// never positive. True when the sweep can be fitted.
bool worth_fitting(Measurement& result, const SweepData& data);

/// What the fit shows: not_causal, model_misfit, negative_resistance, span_misses_resonance, magnitude_only.
void judge_sweep(Measurement& result, const SweepModel& model, const SweepData& data);

/// What the points asked for show: near_resonance, low_q.
void judge_points(Measurement& result);

/// The inputs of add_estimates(): errors of the bench around 0 and the fit.
std::vector<InputError> sweep_errors(const SweepModel& model);
FittedInputs sweep_fitted(const SweepModel& model);

/// The self-resonance of a circuit, found from a nearby one; NaN when the steps lead away.
double nearby_resonance_hz(const Circuit& circuit, double start_hz);

}  // namespace coilassay

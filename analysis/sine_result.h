// What a measured impedance says beyond its numbers. Internal to this room.
#pragma once

#include "analysis/measurement.h"
#include "analysis/sine_record.h"

namespace coilassay {

/// Largest Q whose resistance the uncertainty of the time between the channels leaves good to 10 %:
/// 0.1/(omega u_t), since dR/R = Q omega dt.
double q_ceiling(double omega, double u_time_s);

/// Findings about phase, resistance, shunt and probe; withholds to bounds what the uncertainty hides.
void judge_impedance(Measurement& result, const SineRecord& sine, const SineInputs& inputs, const SineRequest& request);

/// Fit, harmonics and Q ceiling by name.
ModelSummary model_of(const SineRecord& sine, const SineInputs& inputs);

}  // namespace coilassay

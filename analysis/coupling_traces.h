// What the figure of a coupling measurement shows.
#pragma once

#include "analysis/coupling_solution.h"
#include "analysis/measurement.h"

namespace coilassay {

/// Tables "trace_<item>" (frequency_Hz, measured, fitted; inductance in H or a ratio) for every item read at several
/// frequencies; "trace_k" (frequency_Hz, k) from readings alone, frequency by frequency, and "trace_k_fit" of the solution.
/// Without sweeps "trace_inputs" has the residual of each input.
void add_coupling_traces(Measurement& result, const CouplingSolution& solution);

}  // namespace coilassay

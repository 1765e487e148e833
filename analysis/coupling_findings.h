// What a careful colleague would notice about a pair of windings and how it was measured.
#pragma once

#include "analysis/coupling.h"
#include "analysis/coupling_result.h"
#include "analysis/coupling_solution.h"
#include "analysis/measurement.h"

namespace coilassay {

/// Adds findings, the cautions that follow from a step-up, and what to do next.
void judge_coupling(Measurement& result, const CouplingSolution& solution, const CouplingVerdict& verdict,
                    const CouplingRequest& request);

}  // namespace coilassay

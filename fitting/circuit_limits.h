// One-sided limits for what a sweep does not show.
#pragma once

#include "fitting/circuit_equations.h"
#include "fitting/circuit_fit.h"

namespace coilassay {

/// Adds to `fit.limits` every parameter whose 95 % interval by profile likelihood reaches zero (k_rel: one), marks them in
/// fit.fit.at_bound. Parameters of a second tank other than C_2 are not looked at.
void find_limits(const CircuitEquations& equations, CircuitFit& fit);

}  // namespace coilassay

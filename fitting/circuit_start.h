// Where a circuit's fit begins: starts found in the data, the best of them refined on a few points.
#pragma once

#include <optional>
#include <span>

#include "fitting/circuit_equations.h"
#include "fitting/circuit_fit.h"

namespace coilassay {

/// The best start of a family: each start in a list is followed on about 51 of the points (ln z), first for R L C, then with
/// the family's other elements one after the other. Nothing when no point has a positive imaginary part.
/// `points`: usable, rising. Without phases (u_phase infinite everywhere) the phase is taken from the slope of ln |z|
/// against ln f, as in every circuit of this kind (Bode's relation, first term).
std::optional<Circuit> start_circuit(const CircuitData& data, std::span<const std::size_t> points, const CircuitFamily& family,
                                     double reference_hz);

/// Starts of a larger family from a circuit of a smaller one: `added` are the elements the family has more.
Circuit extend_circuit(const CircuitEquations& equations, const Circuit& smaller, const CircuitFamily& family);

/// About `most` of the points, evenly spread, both ends in.
std::vector<std::size_t> thin_points(std::span<const std::size_t> points, std::size_t most);

}  // namespace coilassay

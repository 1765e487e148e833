// The circuit of a sweep as a subcircuit for SPICE.
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "analysis/measurement.h"

namespace coilassay {

/// How the current grows with the flux, from a ramp: both from zero on, rising.
struct SaturationLaw {
  std::string source;             // file; outside text
  std::vector<double> current_a, flux_wb;
};

/// A two-terminal subcircuit of passive elements: R_dc, L and the elements across as they are; the relaxation is a part of L
/// with a resistance across it; the skin effect's sqrt(s) is a chain of resistances with inductances across them, two
/// to a decade over the span and two decades beyond either end, by the trapezoidal rule of docs/formulas.md#ladder (within
/// 0.05 % of it). With a saturation law, L is a behavioural source that follows it, its flux scaled so that L at small current
/// is that of the sweep. Named after the file that was measured. Nothing when the measurement has no circuit.
///
/// @param low_hz, high_hz  the span over which the ladder must hold
std::optional<std::string> sweep_netlist(const Measurement& measurement, double low_hz, double high_hz, std::string_view program,
                                         const SaturationLaw* law = nullptr);

}  // namespace coilassay

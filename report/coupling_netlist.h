// Coupled windings as a subcircuit for SPICE.
#pragma once

#include <optional>
#include <string>
#include <string_view>

#include "analysis/measurement.h"

namespace coilassay {

/// A subcircuit with two terminals for each winding: inductance and resistance in series, the winding's capacitance across,
/// and a coupling for each pair. Simulators take positive couplings only: where M is negative the second winding is laid the
/// other way round; where three signs cannot all be turned, the coupling keeps its sign. Resistances are those of the model
/// at low frequency. Named after the first file, reduced to letters, digits and underscore. Nothing when k is not known, or
/// when matrices of more windings cannot be those of real coils.
std::optional<std::string> coupling_netlist(const Measurement& measurement, std::string_view program);

}  // namespace coilassay

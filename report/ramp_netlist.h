// The L(i) law of a ramp as a subcircuit for SPICE.
#pragma once

#include <optional>
#include <string>
#include <string_view>

#include "analysis/measurement.h"

namespace coilassay {

/// A two-terminal subcircuit: the winding resistance in series with a coil whose current is a piecewise linear function of
/// its flux, odd around zero and going on straight beyond the highest current seen. The flux is the voltage of an inner node
/// in units of the flux at that current, so that a simulator's absolute tolerances suit it. Named after the file that was
/// measured, reduced to letters, digits and underscore. Nothing when the measurement has no curve from zero current on.
std::optional<std::string> ramp_netlist(const Measurement& measurement, std::string_view program);

}  // namespace coilassay

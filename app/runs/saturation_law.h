// The L(i) of a ramp, from the JSON result it was written to.
#pragma once

#include <string>

#include "base/result.h"
#include "report/sweep_netlist.h"

namespace coilassay {

/// Reads current and flux of `coilassay ramp --json`. unreadable; not_a_capture: no such document, or one without a curve from
/// zero current on.
Result<SaturationLaw> read_saturation_law(const std::string& path);

}  // namespace coilassay

// Panels of a coupling measurement.
#pragma once

#include <vector>

#include "report/figure.h"

namespace coilassay {

/// Inductances measured and fitted over frequency, k over frequency; without sweeps how far each input lies from what the
/// solution says.
std::vector<FigurePanel> coupling_panels(const Measurement& measurement);

}  // namespace coilassay

// Figure of four-wire readings.
#pragma once

#include <vector>

#include "analysis/measurement.h"
#include "report/figure.h"

namespace coilassay {

/// Voltage against current with the line through the readings, and resistance in the order of reading.
std::vector<FigurePanel> resistance_panels(const Measurement& measurement);

}  // namespace coilassay

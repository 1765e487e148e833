// What a ramp looks like.
#pragma once

#include <vector>

#include "report/figure.h"

namespace coilassay {

/// Voltage, current and flux over time; L against i with its band and the points of 10, 20 and 30 % drop.
std::vector<FigurePanel> ramp_panels(const Measurement& measurement);

}  // namespace coilassay

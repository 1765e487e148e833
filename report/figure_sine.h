// Panels of a steady-sine measurement.
#pragma once

#include "report/figure.h"

namespace coilassay {

/// Voltage and current with their fits, residuals and the impedance as an arrow; of several captures L and R over
/// frequency or bias. Only what the measurement's tables hold.
std::vector<FigurePanel> sine_panels(const Measurement& measurement);

}  // namespace coilassay

// Panels of a sweep.
#pragma once

#include "report/figure.h"

namespace coilassay {

/// Size and angle of Z with the fitted circuit and the self-resonance, L_s and R_s with their 95 % bands, Q, and what the
/// causality test leaves. Only what the measurement's tables hold.
std::vector<FigurePanel> sweep_panels(const Measurement& measurement);

}  // namespace coilassay

// Where the joint solution begins.
#pragma once

#include <cmath>

#include "analysis/coupling_readings.h"

namespace coilassay {

struct CouplingStart {
  double l1 = std::nan(""), l2 = std::nan(""), k = 0.5;
};

/// L_1, L_2 and k from the readings at their lowest frequencies, as ideal windings would have them; what they do not tell is
/// guessed. k keeps a sign that readings show, and is below 1.
CouplingStart coupling_start(const CouplingReadings& readings);

}  // namespace coilassay

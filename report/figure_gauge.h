// Figure of a gauge study.
#pragma once

#include "report/figure.h"
#include "report/gauge_record.h"

namespace coilassay {

/// Readings of every part by operator, and the deviations with their intervals.
Figure figure_of(const GaugeRecord& record);

}  // namespace coilassay

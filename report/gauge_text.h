// A gauge study as a person reads it.
#pragma once

#include <string>

#include "report/gauge_record.h"
#include "report/result_text.h"

namespace coilassay {

std::string to_text(const GaugeRecord& record, const TextStyle& style);

}  // namespace coilassay

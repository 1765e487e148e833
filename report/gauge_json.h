// "coilassay.gauge/1" (docs/schemas/gauge.schema.json).
#pragma once

#include <string>
#include <string_view>

#include "report/gauge_record.h"

namespace coilassay {

std::string to_json(const GaugeRecord& record, std::string_view program);

}  // namespace coilassay

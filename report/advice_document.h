// The advice on measuring a coupling, for people and for programs.
#pragma once

#include <string>
#include <string_view>

#include "analysis/coupling_advice.h"
#include "report/result_text.h"

namespace coilassay {

/// coilassay.advice/1 (docs/schemas/advice.schema.json).
std::string to_json(const CouplingAdvice& advice, std::string_view program);

std::string to_text(const CouplingAdvice& advice, const TextStyle& style);

}  // namespace coilassay

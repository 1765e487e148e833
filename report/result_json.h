// The JSON documents of docs/schemas: what programs read.
#pragma once

#include <nlohmann/json_fwd.hpp>
#include <string>

#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

/// "coilassay.result/1"; `program` is "coilassay 0.1.0". One line feed at the end, two blanks of indentation.
std::string to_json(const Measurement& measurement, std::string_view program);

/// "coilassay.error/1".
std::string to_json(const Error& error);

}  // namespace coilassay

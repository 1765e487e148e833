// The JSON documents of docs/schemas: what programs read.
#pragma once

#include <nlohmann/json_fwd.hpp>
#include <string>
#include <string_view>
#include <vector>

#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

/// "coilassay.result/1"; `program` is "coilassay 0.1.0". One line feed at the end, two blanks of indentation.
std::string to_json(const Measurement& measurement, std::string_view program);

/// The same document, to be part of another one.
nlohmann::ordered_json result_document(const Measurement& measurement, std::string_view program);

nlohmann::ordered_json findings_document(const std::vector<Finding>& findings);
nlohmann::ordered_json equipment_document(const std::vector<EquipmentItem>& items);

/// "coilassay.error/1".
std::string to_json(const Error& error);

}  // namespace coilassay

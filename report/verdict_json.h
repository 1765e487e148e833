// Verdicts in documents: of a lot, of a unit's line, and in a ledger's entry, which is read again.
#pragma once

#include <nlohmann/json_fwd.hpp>

#include "analysis/measurement.h"
#include "base/result.h"
#include "inspection/verdict.h"

namespace coilassay {

nlohmann::ordered_json limit_document(const LimitVerdict& limit);

/// The way back, to the last digit, for a limit of the sheet it was judged by; ledger when it is no document of that kind.
Result<LimitVerdict> limit_of_document(const nlohmann::ordered_json& document, const Limit& limit);

/// Findings as they stand in a document; ledger when they are none.
Result<std::vector<Finding>> findings_of_document(const nlohmann::ordered_json& document);
/// Cautions of a measurement's document; ledger when they are none.
Result<std::vector<Caution>> cautions_of_document(const nlohmann::ordered_json& document);

}  // namespace coilassay

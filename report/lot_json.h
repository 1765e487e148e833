// Documents of inspection: coilassay.lot/1, coilassay.unit/1 and coilassay.sheet-check/1.
#pragma once

#include <cstdint>
#include <optional>
#include <string>

#include "inspection/sheet_check.h"
#include "report/lot_record.h"

namespace coilassay {

/// The document of a lot, two blanks of indentation.
std::string to_json(const LotRecord& lot);
/// The same on one line, for a reader that follows.
std::string to_json_line(const LotRecord& lot);

/// One line for one unit. `attempt`: what was judged just now; `standing`: what the retest policy makes of all attempts.
std::string unit_line(const UnitVerdict& attempt, const UnitVerdict& standing, std::optional<std::int64_t> entry,
                      bool from_ledger);

std::string to_json(const SheetCheck& check);

}  // namespace coilassay

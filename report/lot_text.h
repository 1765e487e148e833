// What inspection tells people on a terminal.
#pragma once

#include <string>

#include "inspection/sheet_check.h"
#include "report/lot_record.h"
#include "report/result_text.h"

namespace coilassay {

/// The decision first, then every unit that does not pass, the plan, the values of the lot, and what to watch out for.
std::string to_text(const LotRecord& lot, const TextStyle& style);

std::string to_text(const SheetCheck& check, const TextStyle& style);

}  // namespace coilassay

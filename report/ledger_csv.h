// A ledger as a table for spreadsheets.
#pragma once

#include <span>
#include <string>

#include "ledger/ledger.h"

namespace coilassay {

/// One row an entry: what was recorded, then value, interval, limits and verdict of each limited quantity (in SI), and the
/// hash. Cells that a spreadsheet would take for a formula begin with an apostrophe.
std::string ledger_csv(std::span<const Entry> entries);

}  // namespace coilassay

// Ledgers for people: a list, one entry, and whether the chain holds.
#pragma once

#include <optional>
#include <span>
#include <string>

#include "ledger/ledger.h"
#include "report/ledger_json.h"
#include "report/result_text.h"

namespace coilassay {

std::string list_text(std::span<const Entry> entries, const std::string& file, const LedgerHead& head, const TextStyle& style);

/// `corrections`: those of the entry, oldest first.
std::string entry_text(const Entry& entry, std::span<const Entry> corrections, const TextStyle& style);

std::string again_text(const MeasuredAgain& again, const TextStyle& style);

std::string verify_text(const LedgerCheck& check, const std::string& file, const std::optional<ExpectedHead>& expected,
                        const TextStyle& style);

}  // namespace coilassay

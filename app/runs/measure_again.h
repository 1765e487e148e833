// A recorded unit measured again from its raw files: does every digit come out the same?
#pragma once

#include <optional>
#include <string>

#include "app/runs/context.h"
#include "base/result.h"
#include "ledger/entry.h"
#include "report/ledger_json.h"

namespace coilassay {

struct AgainJob {
  std::optional<std::string> sheet;   // where the part sheet is now; else where the run found it
  std::optional<std::string> folder;  // where the captures are now; else where the run found them
};

inline constexpr std::size_t kMostDifferences = 50;

/// Measures and judges as of then: sheet and captures must have the digests that were recorded; a bench sheet that was
/// changed is among the differences. What is compared is the whole record but the program's version and where files lie.
/// @return usage: not an entry of a unit, or one without captures; unreadable: a sheet or capture that is gone or is
///         another one now; whatever sheet and bench sheets refuse.
Result<MeasuredAgain> measure_again(const EntryContent& entry, const AgainJob& job, const RunContext& context);

}  // namespace coilassay

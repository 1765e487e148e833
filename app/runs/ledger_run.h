// What people do with a ledger: look at it, check it, and add corrections.
#pragma once

#include <optional>
#include <string>

#include "app/runs/context.h"
#include "base/result.h"
#include "ledger/ledger.h"
#include "report/ledger_json.h"

namespace coilassay {

struct LedgerVerification {
  LedgerCheck check;
  std::optional<ExpectedHead> expected;
};

/// @param expected_head  a hash that a report printed; whole, or its first 8 digits at least. usage when it is no hash.
Result<LedgerVerification> verify_ledger(const std::string& path, const std::optional<std::string>& expected_head,
                                         const RunContext& context);

/// "17": the number of an entry; usage when it is none.
Result<std::int64_t> entry_number(const std::string& typed);

/// What the record should say. What is absent stays as it stands today.
struct CorrectionJob {
  std::int64_t id = 0;
  std::string reason;
  std::optional<std::string> serial, lot, supplier, verdict;
  std::string operator_name;
};

/// Adds the correction. usage: no reason, a serial of a lot, a verdict that this kind of entry does not have.
Result<Entry> correct_entry(const std::string& path, const CorrectionJob& job, const RunContext& context);

}  // namespace coilassay

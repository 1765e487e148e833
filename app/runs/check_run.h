// The check standard of a part sheet: measured with the lot, kept in the ledger, judged by its control chart.
#pragma once

#include <optional>
#include <vector>

#include "app/runs/context.h"
#include "app/runs/unit_entry.h"
#include "app/runs/unit_tests.h"
#include "base/finding.h"
#include "base/result.h"
#include "inspection/readiness.h"
#include "ledger/ledger.h"

namespace coilassay {

struct CheckOutcome {
  CheckChart chart;
  CheckStatus status;
  std::vector<Finding> findings;  // check_standard
};

/// Measures the captures of the standard when there are any, stores them unless the same are there already, and looks at
/// the chart of all readings in the ledger. Without a ledger the chart has this reading only: it can be judged when the
/// sheet states centre and sigma. Pre: the sheet of the setting has a check standard.
Result<CheckOutcome> run_check(const std::vector<PreparedTest>& tests, const std::optional<LotUnit>& captures,
                               Ledger* ledger, const InspectionSetting& setting, const RunContext& context);

/// The value of the check standard's quantity in what was measured of it, under the conditions of the sheet's limit on that
/// quantity when there is one; nothing when it could not be established, or not under these. Pre: the sheet has a check
/// standard.
std::optional<Estimate> check_value(const PartSheet& sheet, const std::vector<TestRun>& runs);

}  // namespace coilassay

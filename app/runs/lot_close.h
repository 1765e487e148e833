// The end of a lot: which units decide, what they say, and the entry that keeps the decision.
#pragma once

#include <string>
#include <vector>

#include "app/runs/lot_past.h"
#include "report/lot_record.h"

namespace coilassay {

/// Decides `record` from its units by its plan; with a ledger (null: nothing is recorded) the decision is stored. Pre: the
/// record has a plan.
Result<void> close_lot(LotRecord& record, const std::vector<LotHistory>& history, Ledger* ledger, const std::string& ledger_path,
                       const InspectionSetting& setting);

}  // namespace coilassay

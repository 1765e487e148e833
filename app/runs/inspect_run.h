// A part sheet and the captures of a lot in, a verdict per unit and a decision on the lot out.
#pragma once

#include <cstdint>
#include <functional>
#include <optional>
#include <string>

#include "app/runs/context.h"
#include "base/result.h"
#include "report/lot_record.h"

namespace coilassay {

struct InspectJob {
  std::string sheet, folder;
  std::optional<std::string> ledger;            // path; absent: nothing is recorded
  std::optional<std::string> lot;               // else the folder's name
  std::optional<std::uint64_t> lot_size;        // else the units present
  std::string operator_name;
  std::optional<std::string> reason;            // of new attempts at units inspected before
  std::optional<std::string> report;            // where the page will go: checked, not written here
  bool for_page = false;                        // keep figures of every unit that does not pass
};

/// One unit whose attempt is judged and, with a ledger, safely stored.
struct UnitDone {
  const UnitVerdict& attempt;
  const UnitVerdict& standing;                  // after the retest policy
  std::optional<std::int64_t> entry;
  bool from_ledger = false;                     // recorded by an earlier run
};
using UnitFollower = std::function<void(const UnitDone&)>;

/// Measures, judges, records and decides.
///
/// Units are measured in batches of kLargestBatch, `context.threads` at a time; nothing depends on how many. A batch is in
/// the ledger before `follow` hears of it. A unit whose captures are recorded already is not measured again.
///
/// A lot that may not be inspected (plan discontinued, check standard out or overdue and the sheet refuses then) gives a
/// record without plan and units whose decision is undecided and says why.
///
/// @return usage: a lot size below the units present, a new attempt without a reason; ledger; whatever sheet, folder
///         and bench sheets refuse.
Result<LotRecord> run_inspect(const InspectJob& job, const RunContext& context, const UnitFollower& follow);

}  // namespace coilassay

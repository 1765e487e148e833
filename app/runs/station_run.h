// A station: part after part through the fixture, each stored before its verdict is shown, the lot decided at the end.
#pragma once

#include <cstdint>
#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "app/runs/context.h"
#include "app/runs/line_source.h"
#include "base/result.h"
#include "ledger/ledger.h"
#include "report/lot_record.h"

namespace coilassay {

/// How far the lot is; what stands on the screen.
struct StationProgress {
  std::string part, lot;
  std::size_t units = 0;               // with at least one attempt
  std::size_t first_pass = 0;          // passed at their first attempt
  std::size_t standing_pass = 0;       // pass after the retest policy
  std::size_t standing_fail = 0;
  std::optional<std::uint64_t> n;      // units the plan asks for, when the lot's size is known
  std::optional<std::uint64_t> accept; // nonconforming units it allows
};

struct StationUnit {
  const UnitVerdict& attempt;
  const UnitVerdict& standing;
  std::optional<std::int64_t> entry;
  double seconds = 0;                  // from the scan to here
};

/// Something to be told that is no verdict.
struct StationNotice {
  enum class Kind {
    no_part,
    contact,
    no_reading,
    duplicate,    // that serial was inspected already
    refused,      // a line that cannot be used
    blocked,      // check standard or calibration: no part is judged
    checked,      // the check standard was measured
    set_aside,
    told,         // anything else worth a line
  } kind = Kind::told;
  std::string serial, words;           // safe to show
};

/// Shows what happens. A verdict is handed over only after its entry is on the disk.
class StationView {
 public:
  virtual ~StationView() = default;
  virtual void begun(const StationProgress& progress) = 0;
  virtual void unit(const StationUnit& unit, const StationProgress& progress) = 0;
  virtual void notice(const StationNotice& notice, const StationProgress& progress) = 0;
};

struct StationJob {
  std::string sheet;
  std::vector<std::string> profiles;
  std::string ledger, lot;
  std::optional<std::uint64_t> lot_size;   // else the units that were measured
  std::string operator_name;
  std::optional<std::string> trace;
  bool count_serials = false;              // no scanner: numbers, as parts are put in (a presence rule is needed)
  LineSource* input = nullptr;             // not owned
  StationView* view = nullptr;             // not owned
  std::function<UtcTime()> clock;
  std::function<bool()> stopped;
};

/// How a station ended. With `broke` an instrument or the ledger failed for good: what was recorded before stays, and `head`
/// says where the chain ends.
struct StationEnd {
  LotRecord record;                        // decided, unless it broke
  std::optional<Error> broke;
  LedgerHead head;
};

/// Runs until the end of input, `:quit`, a stop, or until something is gone for good.
///
/// Lines are serial numbers, or commands that begin with `:`
///   :again [REASON]  measures the unit shown last, or the one just refused as a duplicate, once more; REASON is a number of
///                    the sheet's [retest] reasons, or words
///   :aside           sets the unit shown last aside: a correction in the ledger makes it undecided
///   :check           measures the check standard
///   :quit            ends
/// A serial that has an attempt already is refused; so is a retest beyond what the sheet's policy counts.
///
/// @return failures before anything is measured: sheet, profiles, ledger, an instrument that does not answer.
Result<StationEnd> run_station(const StationJob& job, const RunContext& context);

}  // namespace coilassay

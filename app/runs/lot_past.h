// What a ledger knows of a lot and of the lots before it.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "app/runs/unit_entry.h"
#include "app/runs/unit_tests.h"
#include "ledger/ledger.h"

namespace coilassay {

/// Earlier attempts at one unit of the lot.
struct UnitPast {
  std::vector<UnitVerdict> attempts;     // judged by this very sheet, oldest first
  std::vector<Entry> entries;            // of these
  std::uint64_t last_attempt = 0;        // highest number given in this lot
  bool recorded = false;                 // the captures that lie there are those of one of these attempts
  bool other_sheet = false;              // they were judged before, by another sheet
  std::optional<Entry> newest;           // whatever its sheet
};

/// Compares digests with those of the captures that lie there; only units with a past are read from the disk.
Result<UnitPast> past_of_unit(const Ledger& ledger, const PartSheet& sheet, const std::string& lot, const LotUnit& unit,
                              const std::vector<PreparedTest>& tests);

/// Why a new attempt at a unit is made, or the refusal when nobody says so.
/// @param stated  of the command line; what a list says of the unit comes first
Result<std::string> reason_for(const UnitPast& past, const LotUnit& unit, const std::optional<std::string>& stated);

/// Decisions on the lots of the sheet's supplier before this one: the first of each lot that was one, oldest first.
Result<std::vector<LotHistory>> lots_before(const Ledger& ledger, const PartSheet& sheet, const std::string& lot);

/// Stores the decision unless it is there already, resting on the same entries by the same sheet.
struct StoredDecision {
  Entry entry;
  std::optional<std::int64_t> replaces;  // the decision on this lot before it
};
Result<StoredDecision> store_decision(Ledger& ledger, const LotOutcome& outcome, const InspectionSetting& setting);

/// One finding for every unit whose serial was inspected in another lot.
Result<std::vector<Finding>> serials_of_other_lots(const Ledger& ledger, const std::string& lot,
                                                   const std::vector<LotUnit>& units);

}  // namespace coilassay

// What inspection leaves in a ledger, and how it is read again: attempts at units, decisions on lots, check standards.
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "analysis/measurement.h"
#include "base/result.h"
#include "base/utc_time.h"
#include "inspection/part_sheet.h"
#include "inspection/readiness.h"
#include "inspection/sampling.h"
#include "inspection/verdict.h"
#include "ledger/entry.h"

namespace coilassay {

/// One test of one unit as it was run.
struct TestRun {
  std::string test;                  // name in the part sheet
  std::string kind;                  // "ringdown", "reading", ...
  std::optional<std::string> bench;  // path of the bench sheet
  std::string bench_sha256;          // of its bytes; empty without one
  Measurement measurement;           // a refused one too
};

/// One attempt at one unit.
struct UnitRun {
  UnitVerdict verdict;         // serial and attempt are in it
  std::vector<TestRun> tests;
  std::string reason;          // of a second and later attempt
};

/// What is the same for every entry of one run.
struct InspectionSetting {
  const PartSheet* sheet = nullptr;  // not owned
  std::string lot;
  std::string operator_name, instrument, program;  // may be empty, the program is not
  UtcTime now{};
};

/// Texts are made safe; tables for figures stay out, everything else of the measurements is in the details.
EntryContent unit_entry(const UnitRun& unit, const InspectionSetting& setting);

/// The verdict of a stored attempt. ledger when it was judged by another sheet or is not one of these entries.
Result<UnitVerdict> verdict_of_entry(const EntryContent& entry, const PartSheet& sheet);

/// Cautions about people and equipment that were raised when a unit was measured.
Result<std::vector<Caution>> cautions_of_entry(const EntryContent& entry);

/// A check standard that was measured: its quantity, and how.
EntryContent check_entry(const Estimate& value, const std::vector<TestRun>& tests, const InspectionSetting& setting);
Result<CheckReading> check_reading_of(const EntryContent& entry);

/// The decision on a lot. `units`: the entries it rests on, in the order of the sample.
struct LotOutcome {
  SamplingPlan plan;
  LotDecision decision;
  NextSeverity next;
  std::vector<std::int64_t> units;
  std::uint64_t lot_size = 0;
};
EntryContent lot_entry(const LotOutcome& lot, const InspectionSetting& setting);
Result<LotHistory> lot_history_of(const EntryContent& entry);
/// The entries a stored decision rests on.
std::vector<std::int64_t> units_of(const EntryContent& entry);

}  // namespace coilassay

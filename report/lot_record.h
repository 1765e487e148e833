// Everything the documents of a lot are made from.
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "analysis/measurement.h"
#include "base/finding.h"
#include "base/utc_time.h"
#include "inspection/lot_values.h"
#include "inspection/part_sheet.h"
#include "inspection/readiness.h"
#include "inspection/sampling.h"
#include "inspection/verdict.h"

namespace coilassay {

struct LotFile {
  std::string test, file, sha256;
};

struct LotUnitRecord {
  UnitVerdict verdict;                      // the one that stands
  std::uint64_t made = 1, counted = 1;      // attempts
  bool in_sample = true;                    // it decides; else measured besides
  bool from_ledger = false;                 // recorded earlier and not measured again
  std::vector<LotFile> files;               // of the newest attempt
  std::optional<std::int64_t> entry;        // of the newest attempt
  std::vector<Measurement> shown;           // with traces, for figures; only of nonconforming units and for a page
};

/// How a test of the sheet was done.
struct LotTestRecord {
  std::string test, kind;
  std::optional<std::string> bench;
  std::string bench_sha256;
  std::vector<EquipmentItem> equipment;
  std::optional<StatedValue> room_temperature;
  std::optional<Measurement> example;       // of the first unit that has values: model, corrections, budget
  std::string example_serial;
};

struct LotLedger {
  std::string file;
  std::int64_t first = 0, last = 0;         // entries of this lot; 0: none
  std::string head;                         // hash of the last entry of the ledger
  std::optional<std::int64_t> entry;        // that holds the decision
  std::optional<std::int64_t> replaces;     // an earlier decision on this lot, by its entry
};

struct LotRecord {
  std::string program;
  UtcTime when{};
  std::string operator_name;                // may be empty; outside text
  PartSheet sheet;
  std::string folder, lot;
  std::uint64_t lot_size = 0;
  std::optional<SamplingPlan> plan;         // absent when the lot was not begun: discontinued, check standard out
  std::vector<LotUnitRecord> units;
  LotDecision decision;
  std::optional<NextSeverity> next;
  std::string severity_why;                 // why this lot is inspected as it is
  std::vector<LotValues> statistics;
  std::vector<LotTestRecord> tests;
  std::vector<Finding> findings;            // of the lot as a whole
  std::vector<Caution> cautions;            // about people and equipment, each once
  std::optional<CheckStatus> check;
  std::optional<CheckChart> check_chart;
  std::optional<LotLedger> ledger;          // absent: nothing was recorded

  /// "0412-51": the lot and the entry of its decision; "0412" when nothing was recorded.
  std::string report_number() const;
};

}  // namespace coilassay

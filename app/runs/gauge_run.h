// Captures or readings of several parts by several operators in, the gauge's share of their spread out.
#pragma once

#include <cstdint>
#include <optional>
#include <string>

#include "app/runs/context.h"
#include "base/quantity.h"
#include "base/result.h"
#include "report/gauge_record.h"

namespace coilassay {

struct GaugeJob {
  std::string input;                       // a folder of captures, or a table of readings
  std::optional<std::string> quantity;     // symbol; else that of the sheet's only limit, or what the test leads with
  std::optional<std::string> part_sheet;   // path: tests, conditions, limits
  std::optional<std::string> bench_sheet;  // path, when there is no part sheet
  std::optional<std::string> tolerance;    // "18.8 uH", max - min; else of the sheet's limit
  std::optional<double> pooling;           // ratio; else GaugeOptions
  std::uint64_t seed = 1;
  std::optional<std::string> figure;       // FILE.svg
};

/// usage: a quantity nobody measures, a part sheet and a bench sheet together; what study_gauge() refuses; a capture
/// without a comparable value, with the reason: a crossed study needs every reading. The figure is written.
Result<GaugeRecord> run_gauge(const GaugeJob& job, const RunContext& context);

}  // namespace coilassay

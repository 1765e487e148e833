// Four-wire readings and bench in, a winding resistance out.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "acquire/bench_sheet.h"
#include "analysis/budget.h"
#include "analysis/measurement.h"
#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

struct ResistanceJob {
  std::vector<std::string> files;   // readings one after the other
  std::optional<std::string> segment;
  std::optional<std::string> bench_sheet;
  BenchSetup stated;                // replaces what the sheet says
  std::optional<std::string> material;                  // "copper", "aluminium"
  std::optional<StatedValue> temperature_coefficient;   // per kelvin at 20 degC, in place of a material
  std::optional<double> rise_constant;                  // K; else that of the metal
  std::optional<StatedValue> cold_resistance, cold_temperature;
  PropagationOptions propagation;
  bool traces = false;
};

/// usage when a cold resistance comes without its temperature, or both a material and a coefficient are given.
Result<Measurement> run_resistance(const ResistanceJob& job, const RunContext& context);

}  // namespace coilassay

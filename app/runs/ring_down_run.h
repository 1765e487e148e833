// Files and bench in, a measured ring-down out.
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

struct RingDownJob {
  std::vector<std::string> files;
  std::optional<std::string> segment;
  std::optional<std::string> bench_sheet;        // path
  BenchSetup stated;                             // replaces what the sheet says
  std::vector<StatedValue> dissipation_factors;  // one for all capacitors, or one for each
  std::optional<double> from_s, to_s;
  PropagationOptions propagation;
  bool traces = false;  // keep what a figure needs
};

/// The set-up of a job: the sheet with what was stated in its place. usage when dissipation factors and capacitors do
/// not match.
Result<BenchSetup> bench_of(const RingDownJob& job);

/// One file: L_s, R_s, Q as far as the capacitor is known; several files, each with its capacitor: L and C_par.
Result<Measurement> run_ring_down(const RingDownJob& job, const RunContext& context);

}  // namespace coilassay

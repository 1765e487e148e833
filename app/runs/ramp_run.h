// A file and a bench in, a measured ramp out.
#pragma once

#include <optional>
#include <string>

#include "acquire/bench_sheet.h"
#include "analysis/budget.h"
#include "analysis/measurement.h"
#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

struct RampJob {
  std::string file;
  std::optional<std::string> segment;
  std::optional<std::string> bench_sheet;   // path
  BenchSetup stated;                        // replaces what the sheet says
  std::optional<double> from_s, to_s;
  PropagationOptions propagation;
  bool traces = false;                      // keep what a figure needs
  std::optional<std::string> netlist_file;  // where the L(i) law goes
};

/// usage: a window that ends before it begins; what driven_record() refuses. The netlist is written when there is a curve.
Result<Measurement> run_ramp(const RampJob& job, const RunContext& context);

}  // namespace coilassay

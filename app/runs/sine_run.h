// Files and bench in, a measured impedance, or the skew between the channels, out.
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

struct SineJob {
  std::vector<std::string> files;
  std::optional<std::string> segment;
  std::optional<std::string> bench_sheet;   // path
  BenchSetup stated;                        // replaces what the sheet says
  std::optional<StatedValue> turns_ratio;   // of a sense winding
  std::vector<StatedValue> biases;          // one for each file, in order
  std::optional<StatedValue> of_resistor;   // the capture is one of a resistor: the skew is looked for
  std::optional<StatedValue> resistor_inductance;
  std::optional<std::string> bench_out;     // a new sheet with the skew that was found
  std::optional<double> from_s, to_s;
  PropagationOptions propagation;
  bool traces = false;                      // keep what a figure needs
};

/// One file: the impedance; several: points over frequency, level or bias. With of_resistor: the skew, and the lines of a
/// bench sheet that state it as advice; with bench_out they are written, together with what the sheet of this job says,
/// to a file that must not exist yet.
Result<Measurement> run_sine(const SineJob& job, const RunContext& context);

/// A bench sheet's text with the skew (and nothing else) replaced or added.
std::string sheet_with_skew(const std::string& sheet, const std::string& skew);

}  // namespace coilassay

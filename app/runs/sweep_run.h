// Files and bench in, a coil's equivalent circuit out, with the models to hand on.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "acquire/bench_sheet.h"
#include "analysis/budget.h"
#include "analysis/measurement.h"
#include "analysis/sweep.h"
#include "app/runs/context.h"
#include "app/runs/sweep_preparation.h"
#include "base/result.h"

namespace coilassay {

struct SweepJob {
  std::vector<std::string> files;           // one sweep, many captures of a steady sine, or captures of a burst
  SweepPreparation preparation;             // ports, fixture, or from a burst
  std::optional<std::string> segment;       // of captures
  std::optional<std::string> bench_sheet;   // path
  BenchSetup stated;                        // replaces what the sheet says
  std::vector<double> at_hz;
  std::optional<double> from_s, to_s;       // window of the captures
  PropagationOptions propagation;
  bool traces = false;                      // keep what a figure needs
  std::optional<std::string> netlist_file, touchstone_file;
  std::optional<std::string> saturation_file;   // JSON result of ramp: its L(i) goes into the netlist
};

/// A sweep ready to be measured: what the files hold, and what is known of its errors.
struct SweepInput {
  Sweep sweep;
  SweepKnowledge knowledge;
  std::vector<SourceRecord> sources;   // of captures; empty: the sweep's own
  std::vector<std::string> notes;      // what was chosen where a file left a choice
  bool refused = false;                // no sweep could be made; its findings say why
};

/// Reads the files of a job: a sweep as it stands, captures as a sweep of sines or of a burst; then ports, fixture and plane.
/// usage: a single capture, sweeps and captures mixed, more than one sweep.
Result<SweepInput> read_sweep(const SweepJob& job, const BenchSetup& bench, const RunContext& context);

/// Reads, measures, writes the models that were asked for. usage: --saturation without --netlist.
Result<Measurement> run_sweep(const SweepJob& job, const RunContext& context);

}  // namespace coilassay

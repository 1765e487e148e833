// What all measuring commands do with their shared options and with their result.
#pragma once

#include <memory>

#include "acquire/bench_sheet.h"
#include "analysis/budget.h"
#include "analysis/measurement.h"
#include "app/commands/arguments.h"
#include "app/commands/console.h"
#include "app/runs/context.h"
#include "app/runs/outputs.h"

namespace coilassay {

/// The signs of the file: --delimiter and --decimal. usage for one that cannot separate columns or mark decimals.
Result<ReadOptions> stated_reading(const Arguments& arguments);

/// Reading options and conditions as a set-up that replaces what a bench sheet says. usage for a sign that cannot
/// separate columns or mark decimals.
Result<BenchSetup> stated_bench(const Arguments& arguments);

/// usage: --trials or --seed without trials.
Result<PropagationOptions> propagation_of(const Arguments& arguments);

OutputRequest outputs_of(const Arguments& arguments);

/// The context of a run: threads, the clock, files, and a progress line when standard error is a terminal.
class RunSession {
 public:
  RunSession(const Arguments& arguments, Console& console, bool quiet);
  const RunContext& context() const { return context_; }
  /// Takes the progress line away, before anything else is shown.
  void end_progress() {
    progress_.reset();
    context_.progress = nullptr;
  }

 private:
  std::unique_ptr<Progress> progress_;
  RunContext context_;
};

/// Writes figure and report, then shows the measurement. Its exit code is 0 when the leading quantity is there and 3
/// when it is not; a document that could not be written is the failure, and the measurement is shown all the same.
Result<ExitCode> finish_measuring(const Measurement& measurement, const Arguments& arguments, Console& console,
                                  const RunContext& context);

}  // namespace coilassay

// Simulated coupled windings: the files an analyser would have written, and the truth behind them.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "acquire/synthetic/coupled_windings.h"
#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

struct SimulateCoupledJob {
  synthetic::CoupledWindings windings;
  std::string output;   // "pair.s2p": the ports; "pair": one table for each connection, pair-primary-open.csv and so on
  std::optional<std::string> truth_file;
};

struct SimulateCoupledDone {
  synthetic::CoupledTruth truth;
  std::vector<std::string> files;
};

/// Writes the port file or the six tables and, when asked for, the truth: every parameter, the seed and the exact quantities
/// of the first two windings. usage for an ending that does not suit the number of windings.
Result<SimulateCoupledDone> run_simulate_coupled(const SimulateCoupledJob& job, const RunContext& context);

}  // namespace coilassay

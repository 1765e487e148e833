// A simulated burst bench: a capture file and the truth behind it.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>

#include "acquire/synthetic/driven_burst.h"
#include "app/runs/context.h"
#include "base/result.h"
#include "base/unit.h"

namespace coilassay {

/// A parameter of the simulated bench that is a number with a unit: "shunt_inductance".
struct BurstParameter {
  std::string_view name;
  Unit unit;
  double synthetic::DrivenBurstBench::*member;
};
std::span<const BurstParameter> burst_parameters();

/// "pulse", "chirp", "noise".
std::string_view name(synthetic::BurstKind kind);

struct SimulateBurstJob {
  synthetic::DrivenBurstBench bench;
  std::string capture_file;  // "-": standard output
  std::optional<std::string> truth_file;
};

/// Writes the capture and, when asked for, the truth: every parameter, the seed, and the coil's elements. usage when both are
/// to go to the same place.
Result<synthetic::DrivenBurstTruth> run_simulate_burst(const SimulateBurstJob& job, const RunContext& context);

}  // namespace coilassay

// A simulated bench: a capture file and the truth behind it.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>

#include "acquire/synthetic/ring_down.h"
#include "app/runs/context.h"
#include "base/result.h"
#include "base/unit.h"

namespace coilassay {

/// A parameter of the simulated bench that is a number with a unit: "probe_capacitance".
struct RingDownParameter {
  std::string_view name;
  Unit unit;
  double synthetic::RingDownBench::*member;
};
std::span<const RingDownParameter> ring_down_parameters();

struct SimulateRingDownJob {
  synthetic::RingDownBench bench;
  std::string capture_file;  // "-": standard output
  std::optional<std::string> truth_file;
};

/// Writes the capture and, when asked for, the truth: every parameter, the seed, and the exact quantities of the
/// circuit. usage when both are to go to the same place.
Result<synthetic::RingDownTruth> run_simulate_ring_down(const SimulateRingDownJob& job, const RunContext& context);

}  // namespace coilassay

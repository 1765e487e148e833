// A simulated steady-sine bench: a capture file and the truth behind it.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>

#include "acquire/synthetic/driven_sine.h"
#include "app/runs/context.h"
#include "base/result.h"
#include "base/unit.h"

namespace coilassay {

/// A parameter of the simulated bench that is a number with a unit: "shunt_inductance".
struct SineParameter {
  std::string_view name;
  Unit unit;
  double synthetic::DrivenSineBench::*member;
};
std::span<const SineParameter> sine_parameters();

struct SimulateSineJob {
  synthetic::DrivenSineBench bench;
  std::string capture_file;  // "-": standard output
  std::optional<std::string> truth_file;
};

/// Writes the capture and, when asked for, the truth: every parameter, the seed, and the exact quantities of the coil at
/// this frequency. usage when both are to go to the same place.
Result<synthetic::DrivenSineTruth> run_simulate_sine(const SimulateSineJob& job, const RunContext& context);

}  // namespace coilassay

// A simulated saturation test: a capture file and the truth behind it.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>

#include "acquire/synthetic/driven_ramp.h"
#include "app/runs/context.h"
#include "base/result.h"
#include "base/unit.h"

namespace coilassay {

/// A parameter of the simulated bench that is a number with a unit.
struct RampParameter {
  std::string_view name;
  Unit unit;
  double& (*member)(synthetic::DrivenRampBench&);
};
std::span<const RampParameter> ramp_parameters();

struct SimulateRampJob {
  synthetic::DrivenRampBench bench;
  std::string capture_file;  // "-": standard output
  std::optional<std::string> truth_file;
};

/// Writes the capture and, when asked for, the truth. usage when both are to go to the same place.
Result<synthetic::DrivenRampTruth> run_simulate_ramp(const SimulateRampJob& job, const RunContext& context);

}  // namespace coilassay

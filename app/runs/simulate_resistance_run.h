// Simulated four-wire readings: a file and the truth behind it.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>

#include "acquire/synthetic/driven_resistance.h"
#include "app/runs/context.h"
#include "base/result.h"
#include "base/unit.h"

namespace coilassay {

/// A parameter of the simulated bench that is a number with a unit: "thermal_offset".
struct DrivenResistanceParameter {
  std::string_view name;
  Unit unit;
  double synthetic::DrivenResistanceBench::*member;
};
std::span<const DrivenResistanceParameter> driven_resistance_parameters();

struct SimulateResistanceJob {
  synthetic::DrivenResistanceBench bench;
  std::string capture_file;  // "-": standard output
  std::optional<std::string> truth_file;
};

/// Writes the readings and, when asked for, the truth. usage when both are to go to the same place.
Result<synthetic::DrivenResistanceTruth> run_simulate_resistance(const SimulateResistanceJob& job, const RunContext& context);

}  // namespace coilassay

// A simulated impedance sweep: a file and the truth behind it.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>

#include "acquire/sweep_writer.h"
#include "acquire/synthetic/coil_sweep.h"
#include "app/runs/context.h"
#include "base/result.h"
#include "base/unit.h"

namespace coilassay {

/// A parameter of the simulated bench that is a number with a unit: "parallel_capacitance".
struct SweepParameter {
  std::string_view name;
  Unit unit;
  double synthetic::CoilSweepBench::*member;
};
std::span<const SweepParameter> sweep_parameters();

struct SimulateSweepJob {
  synthetic::CoilSweepBench bench;
  std::string sweep_file;  // "-": standard output; an ending .s1p makes it Touchstone, any other a table
  SweepColumns columns = SweepColumns::impedance;
  std::optional<std::string> truth_file;
};

/// Writes the sweep and, when asked for, the truth: every parameter, the seed, self-resonance and spoilt points. usage when
/// both are to go to the same place.
Result<synthetic::CoilSweepTruth> run_simulate_sweep(const SimulateSweepJob& job, const RunContext& context);

}  // namespace coilassay

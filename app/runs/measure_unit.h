// One door to every way of measuring: a kind of test, files and a bench in, a measurement out.
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/bench_sheet.h"
#include "analysis/budget.h"
#include "analysis/coupling_circuit.h"
#include "analysis/measurement.h"
#include "app/runs/context.h"
#include "app/runs/sweep_preparation.h"
#include "base/result.h"

namespace coilassay {

/// One test of one unit. The kind is the name of the measuring command; files of one measurement stand in their order.
struct UnitTest {
  std::string kind;                        // "ringdown", "ramp", "sine", "sweep", "coupling", "resistance"
  std::vector<std::string> files;
  std::optional<std::string> segment;
  std::optional<std::string> bench_sheet;  // path
  BenchSetup stated;                       // replaces what the sheet says
  std::optional<double> from_s, to_s;
  std::vector<double> at_hz;                           // sweep: where the model is asked for values
  std::vector<StatedValue> dissipation_factors;        // ringdown: one for all capacitors, or one for each
  std::vector<StatedValue> biases;                     // sine: one for each capture
  SweepPreparation preparation;                        // sweep: how the part hung on the ports
  std::optional<std::string> material;                 // resistance
  std::optional<StatedValue> temperature_coefficient;  // resistance
  std::optional<std::string> dots;                     // coupling: "same", "opposite"
  std::optional<StatedValue> link_inductance, link_resistance;
  std::vector<StatedValue> winding_resistances;        // coupling: none, or of both windings
  PropagationOptions propagation;
  bool traces = false;                     // keep what a figure needs
};

/// The kinds measure_unit() knows, for file names and part sheets.
const std::vector<std::string_view>& unit_test_kinds();

/// What a capture of coupled windings shows, from a piece of its name: "0017.coupling.primary_open.csv".
std::optional<CouplingItem> coupling_item_of(const std::string& path);

/// Measures as the command of that name would. Captures of coupling say by their names what they show; a single one that does
/// not holds all ports. usage: an unknown kind, or more files than the kind takes. The result does
/// not depend on the number of threads; several units may be measured at once, each with a context of its own.
Result<Measurement> measure_unit(const UnitTest& test, const RunContext& context);

}  // namespace coilassay

// Two coupled windings from whatever was measured on them: opened, shorted, in series, voltage ratios, two-port files.
#pragma once

#include <optional>
#include <string>
#include <utility>
#include <variant>
#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "analysis/budget.h"
#include "analysis/coupling_circuit.h"
#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

/// A value that somebody read from a meter: an inductance, or a ratio of voltages.
struct CouplingValue {
  StatedValue value;
  std::optional<double> frequency_hz;   // at which it was read; absent: resistances and capacitances do not count
};

/// One item: a value, a sweep of its impedance, or the result of a sine capture (for a ratio: the driven winding's
/// voltage over the open one's, in ohm).
struct CouplingInput {
  CouplingItem item = CouplingItem::primary_open;
  std::variant<CouplingValue, Sweep, Measurement> given;
};

enum class Dots { same, opposite };

struct CouplingRequest {
  std::vector<CouplingInput> inputs;
  std::optional<Sweep> ports;                    // a two-port file, or one with more ports
  std::pair<std::size_t, std::size_t> pair{0, 1};   // which of its ports are primary and secondary
  std::vector<double> at_hz;                     // empty: the windings themselves, at low frequency
  std::optional<Dots> dots;                      // absent: the sign is that of the files, or not known
  std::optional<StatedValue> link_inductance, link_resistance;   // of the short
  std::optional<StatedValue> winding_resistance_1, winding_resistance_2;
  std::optional<double> common_accuracy;         // half-width of an error that all impedances share
  BenchSetup bench;                              // level, temperature, accuracy of sweeps, equipment
  PropagationOptions propagation;
  bool traces = false;                           // add what a figure needs
};

/// Default tolerances (docs/uncertainty.md): what enters when something was left unsaid.
namespace coupling_defaults {
inline constexpr double kValueRatio = 0.01;           // a meter reading stated without tolerance
inline constexpr double kSweepRatio = 0.005;          // an analyser's impedance, in size and angle, for each file by itself
inline constexpr double kScattering = 0.01;           // of S, where the file holds S
inline constexpr double kLink_h = 20e-9;              // a short that is some centimetres of wire
inline constexpr double kLinkRatio = 0.2;             // of a link stated without tolerance
inline constexpr double kWindingRatio = 0.05;         // of a winding resistance given without tolerance
}  // namespace coupling_defaults

/// L_1, L_2, M, k, n, L_leak_1, L_leak_2 (one_minus_k where k is above 0.9) from all inputs at once, by weighted least squares
/// in ln L_1, ln L_2 and k, with resistances, capacitances, the link and what the inputs share as further unknowns; k^2 in
/// the place of k where no input shows M itself. What the inputs do not determine is left out: two opens and one ratio give
/// k, one ratio alone gives k_over_n or k_times_n.
///
/// k has the interval of chi-square over k, cut at what is possible (fitting/bounded_interval.h); where that is all the data
/// say it stands in `bounds`. A Measurement without k has a refusal that says what to add. `inputs` holds what each input
/// should have been. usage for frequencies outside the sweeps and for several values whose frequency is not clear.
/// Derivations: docs/formulas.md#coupling.
Result<Measurement> measure_coupling(const CouplingRequest& request);

}  // namespace coilassay

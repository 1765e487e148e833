// The points of a sweep that a fit can use, and the errors they share. Internal to this room.
#pragma once

#include <complex>
#include <cstddef>
#include <string>
#include <vector>

#include "analysis/sweep.h"
#include "fitting/circuit_fit.h"

namespace coilassay {

struct SweepData {
  CircuitData points;                        // by rising frequency
  std::vector<std::size_t> index;            // of each in the sweep
  std::vector<std::string> left_out;         // "1.000 MHz: marked as bad"
  std::vector<ImpedanceErrorTerm> errors;    // as in the request, and the accuracy of the analyser; dz_ohm by point of `points`
  double scatter_ratio = 0, scatter_s = 0;   // of each point for itself, by the accuracy: of ln Z, or of S; standard deviations
  bool has_phase = true;
  bool scattering = false;                   // the file holds S
  double low_hz = 0, high_hz = 0;
};

/// Defaults of docs/uncertainty.md.
namespace sweep_defaults {
inline constexpr double kAccuracyRatio = 0.005;   // of Z: a hand-held meter, an analyser without its data sheet
inline constexpr double kScattering = 0.01;       // of S: what is left after an ordinary calibration
inline constexpr double kFrequencyRatio = 100e-6; // a poor crystal
inline constexpr double kPointToPoint = 0.1;      // share of it that may differ from point to point
inline constexpr double kWandering = 0.5;         // share of a stated accuracy that may differ from decade to decade
}  // namespace sweep_defaults

/// Whether a file holds sizes only.
bool is_magnitude_only(const Sweep& sweep);

/// @return too_few_samples, usage (more ports)
Result<SweepData> sweep_data(const Sweep& sweep, const SweepRequest& request);

/// The error of the analyser's frequency, as an error of the impedances it writes beside that frequency.
ImpedanceErrorTerm frequency_error(const SweepData& data, const Circuit& circuit, const SweepRequest& request);

}  // namespace coilassay

// Impedance against frequency from captured waveforms: voltage and current of a pulse, a chirp or a burst of noise.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "analysis/budget.h"
#include "analysis/sweep.h"
#include "base/result.h"

namespace coilassay {

struct WaveformRequest {
  BenchSetup bench;
  std::optional<double> from_s, to_s;   // window, in the time of the captures
  PropagationOptions propagation;       // exact_bench: no default tolerances
};

/// A sweep with what its making says about its errors. It goes the way of any sweep from here.
struct WaveformSweep {
  std::optional<Sweep> sweep;           // one port, Z; absent: `findings` say why
  SweepKnowledge knowledge;             // random errors of each point, errors of the bench as terms; complete
  std::vector<Finding> findings;
  std::string method;                   // "whole record" or "averaged segments"
  double low_hz = 0, high_hz = 0;       // where the excitation carries energy
  std::size_t segment = 0;              // samples; of the record itself when it is taken whole
  double averages = 1;
  std::vector<SourceRecord> sources;
};

/// Z = V/I at the frequencies where the excitation carries energy.
///
/// A record that begins and ends at rest (a pulse or several, a chirp between quiet ends) is transformed whole: nothing is
/// cut off, so nothing leaks, and every line of the spectrum is one value, its error from the noise of the quiet ends. Lines
/// are taken together, weighted by the current's energy, as long as the impedance is straight between them. Several
/// captures of equal length are added up likewise.
///
/// A record that goes on past both ends must be steady noise: Welch's averaged segments, H1 less the noise of the current
/// channel, random errors from the coherence. Two lengths of segment are compared; what their difference says about
/// leakage enters as an error of all points. A record that is neither (a chirp that is cut) is refused: its error bars
/// would be too small.
///
/// Gains, shunt, skew and droop are corrected and enter as errors of all points (docs/formulas.md#waveforms); the time base
/// is left to whoever measures the sweep.
/// @return missing_column, usage as driven_record(); usage for captures of unlike length or step
Result<WaveformSweep> sweep_of_waveforms(std::span<const Capture> captures, const WaveformRequest& request);

}  // namespace coilassay

// The two ways from waveforms to an impedance. Internal to this room.
#pragma once

#include <complex>
#include <vector>

#include "analysis/driven_capture.h"
#include "analysis/waveform_sweep.h"

namespace coilassay {

/// Voltage and current of one capture inside the window, the current's chain not yet taken out.
struct WaveformPair {
  std::vector<double> volts, amps;
};

/// How one channel of one record looks at its ends.
struct QuietEnds {
  bool quiet = false;         // both ends are small beside the burst
  double variance = 0;        // of a sample at rest
  double samples = 0;         // that told it
  double tail = 0;            // what is left at the end beyond the level at the beginning and the noise: amplitude
  double peak = 0;            // of the burst over the level at the beginning
  std::size_t active = 0;     // samples that differ from it by more than a step of the converter and the noise
};
QuietEnds look_at_ends(const std::vector<double>& samples, double resolution);

/// Points of an impedance before the current's chain is taken out.
struct RatioPoints {
  std::vector<double> frequency_hz;
  std::vector<std::complex<double>> ratio;     // V/I as captured
  std::vector<double> u;                       // relative, of modulus and phase alike
  /// Errors that move all points together: what, its law and kind, and the relative change of each point by one u.
  struct Shared {
    std::string source, basis;
    ErrorLaw::Kind law = ErrorLaw::Kind::normal;
    std::vector<std::complex<double>> relative;
  };
  std::vector<Shared> shared;
  std::vector<Finding> findings;
  std::size_t segment = 0;
  double averages = 1;
};

/// Whole records that begin and end at rest.
RatioPoints ratio_of_whole(const std::vector<WaveformPair>& records, double step_s, const DrivenRecord& about);

/// Steady noise. No points and a refusal among the findings when it is not steady or too short.
RatioPoints ratio_of_segments(const std::vector<WaveformPair>& records, double step_s, const DrivenRecord& about);

}  // namespace coilassay

// What a file holds and how it was read, before anything is measured.
#pragma once

#include <cmath>
#include <span>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "base/finding.h"

namespace coilassay {

struct ChannelDescription {
  std::string name;
  Unit unit = Unit::one;
  double first, last, min, max;             // NaN when every sample is missing
  std::size_t missing = 0;
  double noise = std::nan("");              // standard deviation of one sample, same unit; NaN: too short to tell
  double effective_bits = std::nan("");     // of the span used: log2(span / (sqrt(12) x noise and quantisation together))
  double range_used = std::nan("");         // share of the full scale, when that is known
  std::size_t clipped = 0;
  double resolution = std::nan("");
};

struct SegmentDescription {
  std::string label;
  std::size_t samples = 0;
  double start_s = std::nan("");
};

/// The test a file looks made for, and the command line to run next (without the file's name quoted for a shell).
struct Suggestion {
  std::string test;                         // empty when nothing fits
  std::string command;
};

struct Description {
  std::string kind;                         // "waveform" or "sweep"
  Source source;
  Dialect dialect;
  std::vector<Finding> findings;
  Suggestion suggestion;
  // waveform
  std::size_t samples = 0;                  // as they stand in the file, over all segments
  double start_s = std::nan("");
  double sample_interval_s = std::nan("");
  bool uniform = true;
  std::vector<ChannelDescription> channels;
  std::vector<SegmentDescription> segments;
  // sweep
  double frequency_first_hz = std::nan(""), frequency_last_hz = std::nan("");
  std::string parameter;
  std::size_t ports = 0;
  std::vector<double> reference_ohm;
};

Description describe(const Recording& recording);

/// Standard deviation of a single sample by the quietest stretch of the spectrum: lines and slow shapes do not count.
/// NaN for fewer than 32 samples.
double noise_of(std::span<const double> samples);

}  // namespace coilassay

// What a file holds and how it was read, before anything is measured.
#pragma once

#include <cmath>
#include <optional>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "base/finding.h"
#include "base/result.h"

namespace coilassay {

/// One channel over all records of the file.
struct ChannelDescription {
  std::string name;  // outside text
  Unit unit = Unit::one;
  bool unit_stated = false;
  std::size_t column = 0;                            // position in the file counted from 1
  double first = std::nan(""), last = std::nan("");  // of the samples that are there; NaN when all are missing
  double min = std::nan(""), max = std::nan("");
  std::size_t missing = 0;
  double noise = std::nan("");           // standard deviation of one sample; never below resolution/sqrt(12); NaN: too
                                         // short to tell, nothing changes, or less than 1e-7 of the span
  bool noise_is_rounding = false;        // `noise` is mostly the error of rounding to the converter's steps
  double effective_bits = std::nan("");  // of the span that was used: log2((max - min)/(sqrt(12) noise))
  double range_used = std::nan("");      // share of the full scale, when that is known
  std::size_t clipped = 0;
  double resolution = std::nan("");  // step between codes
};

struct SegmentDescription {
  std::string label;  // outside text
  std::size_t samples = 0;
  double start_s = std::nan("");
};

/// What the file looks like and, when the program has a test for it, the command to run next.
struct Suggestion {
  std::string test;        // empty when nothing fits, or the program cannot do it
  std::string command;     // ready for a POSIX shell, file and channels quoted; empty when test is
  std::string looks_like;  // in words; empty when nothing is recognised
  std::string note;        // what the command still wants to know; may be empty
};

struct Description {
  std::string kind;  // "waveform" or "sweep"
  Source source;
  Dialect dialect;
  std::vector<Finding> findings;
  Suggestion suggestion;
  std::size_t samples = 0;  // as they stand in the file, over all records; points of a sweep
  // waveform
  double start_s = std::nan("");            // of the first record; NaN: not known
  double sample_interval_s = std::nan("");  // step between distinct times; NaN: not even, or not known
  bool uniform = true;                      // false: the steps between distinct times are not even, or differ by record
  double span_s = std::nan("");             // from the first sample of the first record to its last
  std::vector<ChannelDescription> channels;
  std::vector<SegmentDescription> segments;
  // sweep
  double frequency_first_hz = std::nan(""), frequency_last_hz = std::nan("");  // as they stand in the file
  std::string parameter;
  std::size_t ports = 0;
  std::vector<double> reference_ohm;
  std::size_t bad_points = 0;  // marked as bad by the file
};

/// A file and what came of reading it.
struct DescribedFile {
  std::string file;
  Result<Description> description;
};

struct DescribeOptions {
  std::vector<std::string> tests;      // the program's tests; others are never suggested
  std::vector<std::string> arguments;  // words to repeat in the suggested command, not yet quoted ("--bench", "b.toml")
};

/// Findings beside those of the reader: clipped, coarse_range, aliased, few_cycles.
Description describe(const Recording& recording, const DescribeOptions& options);

}  // namespace coilassay

// What a reader gives: samples as captured, never filtered, corrected or fitted.
#pragma once

#include <cmath>
#include <complex>
#include <cstddef>
#include <map>
#include <string>
#include <variant>
#include <vector>

#include "base/finding.h"
#include "base/unit.h"

namespace coilassay {

/// Where bytes came from and what they were.
struct Source {
  std::string name;      // as given on the command line; outside text
  std::string sha256;    // of the bytes as stored, compressed or not
  std::size_t bytes = 0;
  std::string identity;  // of an instrument, when known; outside text
};

/// Time of sample n: start_s + n * step_s, or times_s[n] when the steps are not uniform.
struct TimeAxis {
  double start_s = std::nan("");  // NaN: origin not known
  double step_s = std::nan("");   // NaN when not uniform or not known
  std::vector<double> times_s;    // only when not uniform
  bool uniform() const { return times_s.empty(); }
};

struct Channel {
  std::string name;                    // as in the file; outside text
  Unit unit = Unit::one;               // Unit::one when the file does not say
  bool unit_stated = false;
  std::size_t column = 0;              // position in the file counted from 1, a time column counted too
  std::vector<double> samples;         // in `unit`, NaN = missing
  std::size_t missing = 0;
  double resolution = std::nan("");    // step between codes, same unit; NaN = not known
  double full_scale = std::nan("");    // largest magnitude that can be shown; NaN = not known
};

/// How the bytes were understood, for `describe` and for the reading key of a bench sheet.
struct Dialect {
  std::string format;     // "table", "touchstone", "wav"
  std::string encoding;   // "utf-8", "utf-16le", "windows-1252"
  std::string delimiter;  // ",", ";", "\t", " "
  std::string decimal;    // "." or ","
  std::size_t first_data_line = 0;
  std::map<std::string, std::string> settings;  // key,value rows of the preamble; outside text
};

/// One record on one time axis. A file with segments gives several.
struct Capture {
  Source source;
  Dialect dialect;
  std::string segment;  // label, empty when there is only one
  TimeAxis time;
  std::vector<Channel> channels;
  std::vector<Finding> findings;
  std::size_t samples() const { return channels.empty() ? 0 : channels.front().samples.size(); }
};

/// Impedance against frequency: z_ohm[i] is the ports x ports matrix at frequency_hz[i], row by row.
struct Sweep {
  Source source;
  Dialect dialect;
  std::vector<double> frequency_hz;
  std::size_t ports = 1;
  std::vector<std::vector<std::complex<double>>> z_ohm;
  std::string as_read;                 // "Z", "Y", "S", "L_s R_s", ...
  std::vector<double> reference_ohm;   // per port, for S
  /// As the file holds it, when that is S: ports x ports, row by row. A coil between two ports has no impedance matrix.
  std::vector<std::vector<std::complex<double>>> scattering;
  std::vector<bool> bad;               // points the file itself marks as bad
  std::vector<Finding> findings;
};

using Recording = std::variant<std::vector<Capture>, Sweep>;

}  // namespace coilassay

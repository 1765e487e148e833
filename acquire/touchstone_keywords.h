// The lines of a Touchstone file that say how its numbers are meant.
#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/touchstone_matrix.h"
#include "base/result.h"

namespace coilassay {

/// What option line and keywords of a Touchstone file say (open IBIS file specification, versions 1.0 to 2.1, from memory).
struct TouchstoneSetup {
  enum class Format { magnitude_angle, decibel_angle, real_imaginary };
  enum class MatrixFormat { full, lower, upper };

  bool version_2 = false;
  int frequency_exponent = 9;  // GHz when nothing is said
  PortParameter parameter = PortParameter::s;
  Format format = Format::magnitude_angle;
  std::vector<double> reference_ohm = {50};  // one for all, or one for each port
  std::size_t ports = 0;                     // 0: not said
  std::optional<bool> order_12_21;           // of a two-port; the other order when false
  MatrixFormat matrix = MatrixFormat::full;
  std::size_t frequencies = 0;               // stated; 0: not said
  bool option_line_seen = false;
};

/// "# MHz Z RI R 75": any order, any case, each with its default.
/// @param place  for errors
Result<void> read_option_line(std::string_view line, const std::string& place, TouchstoneSetup& setup);

/// "[Number of Ports] 2": the keyword in lower case without brackets, and what follows it.
struct TouchstoneKeyword {
  std::string name;
  std::string rest;
};
std::optional<TouchstoneKeyword> keyword_of(std::string_view line);

/// Takes a keyword of the file's head.
Result<void> read_keyword(const TouchstoneKeyword& keyword, const std::string& place, TouchstoneSetup& setup);

/// Whether a line begins with # and holds option words only.
bool is_option_line(std::string_view line);

}  // namespace coilassay

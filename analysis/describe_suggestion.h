// Which test a capture looks made for.
#pragma once

#include <optional>
#include <string>

#include "acquire/capture.h"
#include "analysis/describe.h"

namespace coilassay {

/// One channel that swings: a free decay or a steady sine.
struct Swing {
  std::size_t channel = 0;
  bool decays = false;
  double cycles = 0;  // in the window of the decay, or in the record
  double samples_per_period = 0;
};

/// What was recognised in a capture.
struct Likeness {
  std::optional<Swing> swing;  // that the suggestion rests on, or the first that swings
  Suggestion suggestion;
};

/// @param capture  the first record of the file
Likeness likely_test(const Capture& capture, const DescribeOptions& options);

/// The suggestion for impedance against frequency.
Suggestion likely_test(const Sweep& sweep, const DescribeOptions& options);

/// A word as a POSIX shell takes it for exactly these bytes: as it is, in single quotes or, where it holds control,
/// bidirectional or invalid bytes, as $'...' with escapes (bash, zsh, ksh).
std::string shell_word(const std::string& outside);

}  // namespace coilassay

// What a careful colleague would notice, with the figure that shows it.
#pragma once

#include <string>
#include <string_view>

#include "base/unit.h"

namespace coilassay {

enum class Severity {
  note,     // know this
  caution,  // the value stands with a wider interval
  refusal,  // no value
};

std::string_view name(Severity severity);

/// Raised by the room that sees it; each code has a paragraph in docs/findings.md.
struct Finding {
  std::string code;       // "clipped", "second_mode", ...
  Severity severity = Severity::note;
  std::string message;    // one sentence for people, figure and remedy included
  std::string about;      // the channel, quantity or file it concerns; may be empty
  double figure = 0;      // the number that shows it
  Unit unit = Unit::one;
};

}  // namespace coilassay

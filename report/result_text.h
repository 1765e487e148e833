// The result as a person reads it in ten seconds.
#pragma once

#include <string>

#include "analysis/measurement.h"
#include "base/number_text.h"
#include "base/result.h"

namespace coilassay {

struct TextStyle {
  Script script = Script::utf8;
  bool color = false;
  bool verbose = false;  // whole budget, all notes, digests
  std::size_t width = 80;
};

std::string to_text(const Measurement& measurement, const TextStyle& style);

/// "<place>: <finding>" and "  try: <remedy>", outside text escaped.
std::string to_text(const Error& error, const TextStyle& style);

}  // namespace coilassay

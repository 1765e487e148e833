// What a run gets from outside: it never looks at a clock, a terminal or the command line itself.
#pragma once

#include <functional>
#include <string>

#include "base/progress.h"
#include "base/result.h"
#include "base/utc_time.h"

namespace coilassay {

struct RunContext {
  Progress* progress = nullptr;  // not owned; may be null
  unsigned threads = 2;          // results do not depend on it
  UtcTime now{};                 // for what carries a date
  /// Stores a finished document; a file appears whole or not at all.
  std::function<Result<void>(const std::string& path, const std::string& contents)> write = {};
};

}  // namespace coilassay

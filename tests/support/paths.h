// Where tests find things: they run in the source folder, and the environment names the program under test.
#pragma once

#include <cstdlib>
#include <string>

namespace coilassay::test {

/// A file of the project, "sample-data/ring.csv"; tests run in the source folder.
inline std::string project_file(const std::string& relative) { return relative; }

/// The program under test.
inline std::string program() {
  const char* named = std::getenv("COILASSAY_PROGRAM");
  return named != nullptr ? named : "build/bin/coilassay";
}

}  // namespace coilassay::test

// Touchstone files. The first byte says how many ports the file's name promises; '0' is a .ts.
#include "tests/fuzz/recording_checks.h"

namespace {
void read_touchstone(std::string_view bytes) {
  if (bytes.empty()) return;
  const char ports = bytes.front();
  const std::string name = ports >= '1' && ports <= '9' ? std::string("input.s") + ports + "p" : "input.ts";
  coilassay::fuzz::check_reading(name, bytes.substr(1));
}
}  // namespace

COILASSAY_FUZZ_TARGET(touchstone, read_touchstone)

// Compressed captures, by the whole door: file, digest, unpacking, reading.
#include "tests/fuzz/input_file.h"
#include "tests/fuzz/recording_checks.h"

namespace {
void read_packed(std::string_view bytes) {
  using namespace coilassay;
  ReadOptions options;
  options.threads = 1;
  fuzz::check_recording(read_recording(fuzz::input_file("input.csv.gz", bytes), options));
}
}  // namespace

COILASSAY_FUZZ_TARGET(packed, read_packed)

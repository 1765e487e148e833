// Tables of samples, in any dialect.
#include "tests/fuzz/recording_checks.h"

namespace {
void read_table(std::string_view bytes) { coilassay::fuzz::check_reading("input.csv", bytes); }
}  // namespace

COILASSAY_FUZZ_TARGET(captures, read_table)

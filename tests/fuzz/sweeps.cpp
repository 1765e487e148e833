// Sweep tables: the same door as captures, other inputs kept.
#include "tests/fuzz/recording_checks.h"

namespace {
void read_sweep(std::string_view bytes) { coilassay::fuzz::check_reading("sweep.txt", bytes); }
}  // namespace

COILASSAY_FUZZ_TARGET(sweeps, read_sweep)

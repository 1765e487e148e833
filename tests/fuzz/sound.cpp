// Recordings of a sound card.
#include "tests/fuzz/recording_checks.h"

namespace {
void read_sound(std::string_view bytes) { coilassay::fuzz::check_reading("input.wav", bytes); }
}  // namespace

COILASSAY_FUZZ_TARGET(sound, read_sound)

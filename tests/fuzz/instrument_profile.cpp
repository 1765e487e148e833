// Instrument profiles.
#include "acquire/instrument/profile.h"
#include "tests/fuzz/recording_checks.h"

namespace {
void read_profile(std::string_view bytes) {
  const auto profile = coilassay::parse_instrument_profile(bytes, "meter.toml");
  if (!profile) return coilassay::fuzz::check_refusal(profile.error());
  coilassay::fuzz::require(profile->reading.has_value() || profile->record.has_value(), "a profile asks for something");
}
}  // namespace

COILASSAY_FUZZ_TARGET(instrument_profile, read_profile)

// Fixture sets.
#include "acquire/fixture_set.h"
#include "tests/fuzz/recording_checks.h"

namespace {
void read_set(std::string_view bytes) {
  const auto set = coilassay::parse_fixture_set(bytes, "fixture.toml");
  if (!set) coilassay::fuzz::check_refusal(set.error());
}
}  // namespace

COILASSAY_FUZZ_TARGET(fixture_set, read_set)

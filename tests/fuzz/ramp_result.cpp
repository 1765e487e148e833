// The result document of a ramp, as --saturation takes it.
#include <cmath>

#include "app/runs/saturation_law.h"
#include "tests/fuzz/input_file.h"
#include "tests/fuzz/recording_checks.h"

namespace {
void read_law(std::string_view bytes) {
  const auto law = coilassay::read_saturation_law(coilassay::fuzz::input_file("ramp.json", bytes));
  if (!law) return coilassay::fuzz::check_refusal(law.error());
  coilassay::fuzz::require(law->current_a.size() == law->flux_wb.size() && law->current_a.size() >= 2, "a law has points");
  for (std::size_t i = 1; i < law->current_a.size(); ++i) {
    coilassay::fuzz::require(law->current_a[i] > law->current_a[i - 1] && law->flux_wb[i] > law->flux_wb[i - 1], "and rises");
  }
}
}  // namespace

COILASSAY_FUZZ_TARGET(ramp_result, read_law)

// Tables of a gauge study.
#include <cmath>

#include "app/runs/gauge_readings.h"
#include "tests/fuzz/recording_checks.h"

namespace {
void read_gauge(std::string_view bytes) {
  const auto readings = coilassay::parse_gauge_table(bytes, "gauge.csv", coilassay::Unit::henry);
  if (!readings) return coilassay::fuzz::check_refusal(readings.error());
  coilassay::fuzz::require(!readings->empty(), "a study has readings");
  for (const auto& reading : *readings) coilassay::fuzz::require(std::isfinite(reading.value), "a reading is a number");
}
}  // namespace

COILASSAY_FUZZ_TARGET(gauge_table, read_gauge)

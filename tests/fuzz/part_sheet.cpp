// Part sheets.
#include "inspection/part_sheet.h"
#include "tests/fuzz/recording_checks.h"

namespace {
void read_sheet(std::string_view bytes) {
  const auto sheet = coilassay::parse_part_sheet(bytes, "part.toml");
  if (!sheet) return coilassay::fuzz::check_refusal(sheet.error());
  for (const auto& limit : sheet->limits) {
    coilassay::fuzz::require(limit.min.has_value() || limit.max.has_value(), "a limit limits something");
  }
}
}  // namespace

COILASSAY_FUZZ_TARGET(part_sheet, read_sheet)

// Bench sheets.
#include "acquire/bench_sheet.h"
#include "tests/fuzz/input_file.h"
#include "tests/fuzz/recording_checks.h"

namespace {
void read_sheet(std::string_view bytes) {
  const auto sheet = coilassay::read_bench_sheet(coilassay::fuzz::input_file("bench.toml", bytes));
  if (!sheet) coilassay::fuzz::check_refusal(sheet.error());
}
}  // namespace

COILASSAY_FUZZ_TARGET(bench_sheet, read_sheet)

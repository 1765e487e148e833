// Cells of tables: what is taken for a plain number is the same double as strtod makes of it.
#include <bit>
#include <cmath>
#include <cstdlib>
#include <cstring>
#include <string>

#include "acquire/number_scan.h"
#include "tests/fuzz/target.h"

namespace {

using namespace coilassay;
using fuzz::require;

/// Digits, a decimal point, an exponent and nothing else: what strtod and we must agree on.
bool plain(std::string_view cell) {
  std::size_t at = 0;
  const auto digits = [&] {
    const std::size_t from = at;
    while (at < cell.size() && cell[at] >= '0' && cell[at] <= '9') ++at;
    return at - from;
  };
  const auto sign = [&] {
    if (at < cell.size() && (cell[at] == '-' || cell[at] == '+')) ++at;
  };
  sign();
  std::size_t count = digits();
  if (at < cell.size() && cell[at] == '.') {
    ++at;
    count += digits();
  }
  if (count == 0) return false;
  if (at < cell.size() && (cell[at] == 'e' || cell[at] == 'E')) {
    ++at;
    sign();
    if (digits() == 0) return false;
  }
  return at == cell.size();
}

void compare(const char* cell, double value) {
  const double expected = std::strtod(cell, nullptr);
  require(std::bit_cast<std::uint64_t>(value) == std::bit_cast<std::uint64_t>(expected), "the same double as strtod");
}

void read_number(std::string_view bytes) {
  if (bytes.size() > 400) return;
  std::string padded(bytes);
  padded.append(64, '\0');
  for (const char decimal : {'.', ','}) {
    for (const int shift : {0, -3, 6}) {
      const CellValue cell = read_cell(bytes, decimal, shift);
      require((cell.kind == CellKind::number) == std::isfinite(cell.value) || cell.kind == CellKind::text, "kind and value agree");
      if (cell.kind == CellKind::number) written_digits(bytes, decimal);
    }
  }
  if (!plain(bytes)) return;
  const std::string cell(bytes);
  const CellValue read = read_cell(cell, '.');
  if (read.kind == CellKind::number) compare(cell.c_str(), read.value);
  else require(!std::isfinite(std::strtod(cell.c_str(), nullptr)) || std::fabs(std::strtod(cell.c_str(), nullptr)) > 1e37,
               "a plain number is one unless it stands for over-range");
  double fast = 0;
  if (const char* end = scan_number<'.'>(padded.data(), 0, fast); end != nullptr && end == padded.data() + bytes.size()) {
    compare(cell.c_str(), fast);
  }
}

}  // namespace

COILASSAY_FUZZ_TARGET(number_scan, read_number)

// Claim: every number of a table is the very double that strtod gives, in every form it can be written in.
// Two million random numbers of each form (a sample of them is in tests/acquire/number_scan_table_test.cpp): values over
// many decades, doubles of random bits, and the halfway cases between neighbouring doubles.
#include <fmt/format.h>

#include <bit>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <string>

#include "acquire/number_scan.h"
#include "base/random.h"

namespace {

using namespace coilassay;

/// As the table reader does it: the quick scan, and the careful one for what it leaves.
double read(const std::string& padded, std::size_t size, bool& quick) {
  double value = std::nan("");
  const char* const behind = scan_number<'.'>(padded.data(), 0, value);
  quick = behind == padded.data() + size;
  if (quick) return value;
  return read_cell(std::string_view(padded).substr(0, size), '.').value;
}

double drawn(Random& random, bool any_bits) {
  if (any_bits) {
    for (;;) {
      const double value = std::bit_cast<double>(random.bits());
      if (std::isfinite(value) && std::fabs(value) < 9e37) return value;
    }
  }
  const double size = std::pow(10.0, random.uniform(-16, 12));
  return (random.below(2) == 0 ? -size : size) * random.uniform(0.1, 1.0);
}

}  // namespace

int main(int argc, char** argv) {
  const std::size_t kEach = argc > 1 ? static_cast<std::size_t>(std::atoll(argv[1])) : 2'000'000;
  std::size_t wrong = 0;
  for (const bool any_bits : {false, true}) {
    for (const char* form : {"{:.8e}", "{:.6f}", "{:.5e}", "{:g}", "{:.9g}", "{:.12g}", "{:.15g}", "{:.17g}", "{:.18e}", "{}", "{:.3f}", "{:.0f}",
                             "{:+.6E}", "{:.20f}"}) {
      Random random(11);
      std::size_t differ = 0;
      std::size_t quickly = 0;
      std::string text;
      for (std::size_t i = 0; i < kEach; ++i) {
        text = fmt::format(fmt::runtime(form), drawn(random, any_bits));
        const std::size_t size = text.size();
        const double expected = std::strtod(text.c_str(), nullptr);
        text += '\n';
        text.append(64, '\0');
        bool quick = false;
        const double value = read(text, size, quick);
        quickly += quick ? 1U : 0U;
        if (std::bit_cast<std::uint64_t>(value) != std::bit_cast<std::uint64_t>(expected)) {
          if (differ++ == 0) std::printf("first that differs: %.*s\n", static_cast<int>(size), text.c_str());
        }
      }
      std::printf("%-8s %s: %zu of %zu differ from strtod; %.1f %% by the quick scan\n", form, any_bits ? "any bits" : "decades ", differ, kEach,
                  100.0 * static_cast<double>(quickly) / static_cast<double>(kEach));
      wrong += differ;
    }
  }
  return wrong == 0 ? 0 : 1;
}

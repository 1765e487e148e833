// Every number of a table is the double that strtod gives for the same text.
#include "acquire/number_scan.h"

#include <fmt/format.h>
#include <gtest/gtest.h>

#include <bit>
#include <cmath>
#include <cstdlib>
#include <string>

#include "base/random.h"

namespace coilassay {
namespace {

/// As the table reader does it: the quick scan, and the careful one for what it leaves.
double read(const std::string& text) {
  const std::string padded = text + "\n" + std::string(64, '\0');
  double value = std::nan("");
  const char* const behind = scan_number<'.'>(padded.data(), 0, value);
  if (behind != nullptr && *behind == '\n') return value;
  return read_cell(text, '.').value;
}

std::string random_number(Random& random, const char* form) {
  const double size = std::pow(10.0, random.uniform(-14, 10));
  const double value = (random.below(2) == 0 ? -size : size) * random.uniform(0.1, 1.0);
  return fmt::format(fmt::runtime(form), value);
}

// A sample of tests/proof/number_scan_exact.cpp, which reads two million of each.
TEST(NumberScan, GivesTheSameBitsAsStrtod) {
  Random random(20260704);
  for (const char* form : {"{:.8e}", "{:.6f}", "{:.5e}", "{:g}", "{:.9g}", "{:.12g}", "{:.15g}", "{:.17g}", "{:.3f}", "{:.0f}", "{:+.6E}", "{:.20f}"}) {
    for (int i = 0; i < 3000; ++i) {
      const std::string text = random_number(random, form);
      const double expected = std::strtod(text.c_str(), nullptr);
      ASSERT_EQ(std::bit_cast<std::uint64_t>(read(text)), std::bit_cast<std::uint64_t>(expected)) << text;
    }
  }
}

TEST(NumberScan, RoundsTheHardCasesAsStrtodDoes) {
  for (const char* text : {"0", "-0", "0.0", "9007199254740993", "9007199254740992", "1e22", "1e23", "8.5e22", "123456789012345678",
                           "0.1234567890123456789", "4.9406564584124654e-324", "2.2250738585072011e-308", "1e-310", "5e-400",
                           "0.000000000000000000000000000000001", "1.7976931348623157e37", ".5", "5.", "+.25e+3", "-1E5",
                           "00012.50", "99999999.99999999", "12345678.12345678", "1.00000000000000011102230246251565"}) {
    const double expected = std::strtod(text, nullptr);
    EXPECT_EQ(std::bit_cast<std::uint64_t>(read(text)), std::bit_cast<std::uint64_t>(expected)) << text;
  }
}

TEST(NumberScan, ShiftsAPrefixBeforeItRounds) {
  EXPECT_EQ(read_cell("47.1", '.', -3).value, 47.1e-3);
  EXPECT_EQ(read_cell("0.1", '.', -6).value, 0.1e-6);
  EXPECT_EQ(read_cell("1,5", ',', 3).value, 1500.0);
}

TEST(NumberScan, ReadsPrefixesAndPartedThousands) {
  EXPECT_EQ(read_cell("10u", '.').value, 10e-6);
  EXPECT_EQ(read_cell("35m", '.').value, 35e-3);
  EXPECT_EQ(read_cell("1M", '.').value, 1e6);
  EXPECT_EQ(read_cell("-4.7 k", '.').value, -4700.0);
  EXPECT_EQ(read_cell("10\xC2\xB5", '.').value, 10e-6);
  EXPECT_EQ(read_cell("999E-06", '.').value, 999e-6);
  EXPECT_EQ(read_cell("1 234 567.5", '.').value, 1234567.5);
  EXPECT_EQ(read_cell("12\xE2\x80\xAF""345,25", ',').value, 12345.25);
  EXPECT_EQ(read_cell("1\xC2\xA0""234", '.').value, 1234.0);
  EXPECT_EQ(read_cell("\xE2\x88\x92""1.5", '.').value, -1.5);
  EXPECT_EQ(read_cell("-00.0000", '.').value, 0.0);
  for (const char* text : {"1 23", "1 2345", "1234 567", "1.5 000", "10x", "10uu", "1 234 5"}) {
    EXPECT_EQ(read_cell(text, '.').kind, CellKind::text) << text;
  }
}

struct Case {
  const char* cell;
  CellKind kind;
};

TEST(NumberScan, TellsNumbersFromTheWordsForNone) {
  for (const Case& c : {Case{"1.5", CellKind::number}, Case{" 1.5 ", CellKind::number}, Case{"\"1.5\"", CellKind::number},
                        Case{"", CellKind::missing}, Case{"  ", CellKind::missing}, Case{"nan", CellKind::missing},
                        Case{"NaN", CellKind::missing}, Case{"-nan", CellKind::missing}, Case{"----", CellKind::missing},
                        Case{"inf", CellKind::over_range}, Case{"-Infinity", CellKind::over_range},
                        Case{"\xE2\x88\x9E", CellKind::over_range}, Case{"-\xE2\x88\x9E", CellKind::over_range},
                        Case{"OL", CellKind::over_range}, Case{"Overload", CellKind::over_range},
                        Case{"*****", CellKind::over_range}, Case{"9.9E37", CellKind::over_range},
                        Case{"-9.9E+37", CellKind::over_range}, Case{"9.91e37", CellKind::over_range},
                        Case{"1e400", CellKind::over_range}, Case{"9.8e37", CellKind::number}, Case{"volt", CellKind::text},
                        Case{"1.5.2", CellKind::text}, Case{"1e", CellKind::text}, Case{"--1", CellKind::text},
                        Case{"+-1", CellKind::text}, Case{".", CellKind::text}, Case{"0x10", CellKind::text},
                        Case{"1 V", CellKind::text}, Case{"e5", CellKind::text}}) {
    const CellValue value = read_cell(c.cell, '.');
    EXPECT_EQ(value.kind, c.kind) << "'" << c.cell << "'";
    EXPECT_EQ(std::isnan(value.value), c.kind != CellKind::number) << "'" << c.cell << "'";
  }
}

}  // namespace
}  // namespace coilassay

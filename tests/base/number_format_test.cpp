#include <gtest/gtest.h>

#include <cmath>
#include <cstdint>
#include <limits>

#include "base/number_text.h"
#include "base/random.h"

namespace coilassay {
namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
constexpr double kInfinity = std::numeric_limits<double>::infinity();

struct Written {
  double value, u;
  Unit unit;
  std::string_view text;
};

TEST(ToText, GivesTwoDigitsOfUncertaintyAndThePrefixOfTheValue) {
  const Written cases[] = {
      {47.02e-6, 0.28e-6, Unit::henry, "47.02(28) µH"},
      {-47.02e-6, 0.28e-6, Unit::henry, "-47.02(28) µH"},
      {0.3e-6, 1.2e-6, Unit::henry, "0.3(12) µH"},
      {-0.3e-6, 1.2e-6, Unit::henry, "-0.3(12) µH"},
      {0, 1.2e-6, Unit::henry, "0.0(12) µH"},
      {-1e-9, 1.2e-6, Unit::henry, "0.0(12) µH"},
      {4.7e-5, 4.96e-7, Unit::henry, "47.00(50) µH"},
      {4.7e-5, 9.96e-7, Unit::henry, "47.0(10) µH"},      // the uncertainty carries over
      {999.9996e-6, 1.2e-9, Unit::henry, "999.9996(12) µH"},
      {999.99996e-6, 1.2e-9, Unit::henry, "1.0000000(12) mH"},  // so does the value, into the next prefix
      {470, 310, Unit::volt, "470(310) V"},
      {5, 310, Unit::volt, "0(310) V"},
      {4.7e3, 3.1e3, Unit::ohm, "4.7(31) kΩ"},
      {232.1e3, 1.234, Unit::hertz, "232.1000(12) kHz"},
      {23.4, 0.56, Unit::degree_celsius, "23.40(56) °C"},
      {0.001, 0.56, Unit::degree_celsius, "0.00(56) °C"},
      {2653.2, 12, Unit::per_second, "2653(12) 1/s"},
      {2.6532e7, 1.2e5, Unit::per_second, "26.53(12)×10⁶ 1/s"},
      {68.5, 0.42, Unit::one, "68.50(42)"},
      {0.0005, 0.00002, Unit::one, "0.000500(20)"},
      {12, 3400, Unit::one, "0(3400)"},
      {1e-20, 1e-22, Unit::farad, "10.00(10)×10⁻²¹ F"},
      {1e18, 1e16, Unit::ohm, "1.000(10)×10¹⁸ Ω"},
  };
  for (const Written& c : cases) EXPECT_EQ(to_text(Quantity{c.value, c.u, c.unit}), c.text);
}

TEST(ToText, PlainTextHasAsciiOnly) {
  EXPECT_EQ(to_text(Quantity{47.02e-6, 0.28e-6, Unit::henry}, Script::ascii), "47.02(28) uH");
  EXPECT_EQ(to_text(Quantity{0.1, 0.001, Unit::ohm}, Script::ascii), "100.0(10) mohm");
  EXPECT_EQ(to_text(Quantity{23, 0.5, Unit::degree_celsius}, Script::ascii), "23.00(50) degC");
  EXPECT_EQ(to_text(Quantity{2.6532e7, 1.2e5, Unit::per_second}, Script::ascii), "26.53(12)e6 1/s");
  EXPECT_EQ(to_text_expanded(47.02e-6, 0.46e-6, Unit::henry, Script::ascii), "47.02 uH +/- 0.46 uH");
}

TEST(ToText, WithoutAnUncertaintyGivesTheDigitsAskedFor) {
  EXPECT_EQ(to_text(Quantity{47.02e-6, kNan, Unit::henry}), "47.020 µH");
  EXPECT_EQ(to_text(Quantity{47.02e-6, kNan, Unit::henry}, Script::utf8, 4), "47.02 µH");
  EXPECT_EQ(to_text(Quantity{47.02e-6, 0, Unit::henry}, Script::utf8, 4), "47.02 µH");
  EXPECT_EQ(to_text(232.1e3, Unit::hertz), "232.1 kHz");
  EXPECT_EQ(to_text(999.96, Unit::hertz), "1.000 kHz");  // rounding carries into the next prefix
  EXPECT_EQ(to_text(999.94, Unit::hertz), "999.9 Hz");
  EXPECT_EQ(to_text(-0.0123, Unit::volt), "-12.30 mV");
  EXPECT_EQ(to_text(0, Unit::volt), "0 V");
  EXPECT_EQ(to_text(-0.0, Unit::volt), "0 V");
  EXPECT_EQ(to_text(1e-8, Unit::farad, Script::utf8, 2), "10 nF");
  EXPECT_EQ(to_text(123456, Unit::hertz, Script::utf8, 2), "120 kHz");
  EXPECT_EQ(to_text(0.05, Unit::one, Script::utf8, 2), "0.050");
  EXPECT_EQ(to_text(1234.5, Unit::one), "1234" /* the tie is even */);
  EXPECT_EQ(to_text(1e-12, Unit::one, Script::utf8, 3), "1.00×10⁻¹²");
  EXPECT_EQ(to_text(1e-12, Unit::one, Script::ascii, 3), "1.00e-12");
}

TEST(ToText, SaysThatANumberIsNotKnown) {
  EXPECT_EQ(to_text(Quantity{kNan, 1, Unit::henry}), "not known");
  EXPECT_EQ(to_text(kNan, Unit::henry), "not known");
  EXPECT_EQ(to_text(kInfinity, Unit::henry), "infinite");
  EXPECT_EQ(to_text(-kInfinity, Unit::henry), "-infinite");
  EXPECT_EQ(to_text_expanded(1, kNan, Unit::volt), "1.000 V");
  EXPECT_EQ(to_percent_text(kNan), "not known");
}

TEST(ToText, NeverShowsAnUncertaintyBelowTheDigitsOfADouble) {
  EXPECT_EQ(to_text(Quantity{1, 1e-30, Unit::volt}), "1.000000000000000(1) V");
}

TEST(ToTextExpanded, WritesBothInOnePrefix) {
  EXPECT_EQ(to_text_expanded(47.02e-6, 0.46e-6, Unit::henry), "47.02 µH ± 0.46 µH");
  EXPECT_EQ(to_text_expanded(0.3e-6, 1.2e-6, Unit::henry), "0.3 µH ± 1.2 µH");
  EXPECT_EQ(to_text_expanded(470, 310, Unit::volt), "470 V ± 310 V");
  EXPECT_EQ(to_text_expanded(0.3e-6, 1.2e-4, Unit::henry), "0 µH ± 120 µH");
  EXPECT_EQ(to_text_expanded(68.5, 0.42, Unit::one), "68.50 ± 0.42");
}

TEST(ToPercentText, ChangesToPartsPerMillionBelowATenthOfAPercent) {
  EXPECT_EQ(to_percent_text(0.012), "1.2 %");
  EXPECT_EQ(to_percent_text(-0.012), "-1.2 %");
  EXPECT_EQ(to_percent_text(310e-6), "310 ppm");
  EXPECT_EQ(to_percent_text(314.2e-6), "314 ppm");
  EXPECT_EQ(to_percent_text(0.0999), "10 %");
  EXPECT_EQ(to_percent_text(0.000999), "0.10 %");
  EXPECT_EQ(to_percent_text(1), "100 %");
  EXPECT_EQ(to_percent_text(1.234), "123 %");
  EXPECT_EQ(to_percent_text(2.5e-6), "2.5 ppm");
  EXPECT_EQ(to_percent_text(9.994), "999 %");
  EXPECT_EQ(to_percent_text(2.28e40), "more than 1000 %");
  EXPECT_EQ(to_percent_text(-11), "less than -1000 %");
  EXPECT_EQ(to_percent_text(0), "0 %");
  EXPECT_EQ(to_percent_text(1e-12, Script::ascii), "1.0e-10 %");
}

TEST(ToShortest, ReadsBackToTheSameDouble) {
  EXPECT_EQ(to_shortest(0.1), "0.1");
  EXPECT_EQ(to_shortest(2e-8), "2e-08");
  EXPECT_EQ(to_shortest(10), "10");
  Random random(5);
  for (int i = 0; i < 20000; ++i) {
    const double value = std::ldexp(random.uniform(-1, 1), static_cast<int>(random.below(2000)) - 1000);
    EXPECT_EQ(parse_plain_number(to_shortest(value)), value);
  }
  for (const double value : {0.0, 5e-324, 1.7976931348623157e308, 1e23, 9007199254740993.0}) {
    EXPECT_EQ(parse_plain_number(to_shortest(value)), value);
  }
}

// What is written can be read: the value to its last digit shown, the uncertainty to its two digits.
TEST(ToText, IsReadBackByParseValue) {
  Random random(11);
  for (int i = 0; i < 5000; ++i) {
    const double value = random.uniform(-1, 1) * std::pow(10, random.uniform(-14, 13));
    const double u = std::abs(value) * std::pow(10, random.uniform(-9, 1.5));
    const Script script = random.below(2) == 0 ? Script::utf8 : Script::ascii;
    const std::string text = to_text(Quantity{value, u, Unit::ohm}, script);
    if (text.find("×10") != std::string::npos) continue;
    const auto read = parse_value(text, Unit::ohm, "x");
    ASSERT_TRUE(read) << text << " " << read.error().finding;
    EXPECT_NEAR(read->standard_uncertainty, u, 0.051 * u) << text;
    EXPECT_NEAR(read->value, value, 0.051 * u) << text;
  }
}

}  // namespace
}  // namespace coilassay

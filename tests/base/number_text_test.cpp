#include "base/number_text.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <numbers>
#include <ostream>

namespace coilassay {
namespace {

using testing::HasSubstr;

struct Typed {
  std::string_view text;
  Unit unit;
  double value;
};

TEST(ParseValue, ABareNumberThatWouldBeAHugeCapacitorOrCoilIsAskedFor) {
  for (const char* text : {"10", "10±1%", "0.01", "-47"}) {
    const auto farads = parse_value(text, Unit::farad, "--capacitor");
    ASSERT_FALSE(farads) << text;
    EXPECT_EQ(farads.error().problem, Problem::ambiguous);
    EXPECT_THAT(farads.error().remedy, HasSubstr("nF"));
  }
  EXPECT_FALSE(parse_value("47", Unit::henry, "--inductance"));
  EXPECT_TRUE(parse_value("10F", Unit::farad, "--capacitor"));
  EXPECT_TRUE(parse_value("10 ± 1 F", Unit::farad, "--capacitor"));
  EXPECT_TRUE(parse_value("1e-8", Unit::farad, "--capacitor"));
  EXPECT_TRUE(parse_value("2.5H", Unit::henry, "--inductance"));
  EXPECT_TRUE(parse_value("10", Unit::ohm, "--across"));
}

TEST(ParseValue, ReadsWhatPeopleTypeAsExactlyTheDoubleOfTheDecimalNumber) {
  const Typed cases[] = {
      {"10nF", Unit::farad, 1e-8},
      {"10 nF", Unit::farad, 1e-8},
      {" 10 n F ", Unit::farad, 1e-8},
      {"10\u00a0nF", Unit::farad, 1e-8},
      {"10\u202fnF", Unit::farad, 1e-8},
      {"10\u2009nF", Unit::farad, 1e-8},
      {"2.2e-9 F", Unit::farad, 2.2e-9},
      {"2.2E+3Hz", Unit::hertz, 2200},
      {"2.2e-9", Unit::farad, 2.2e-9},
      {"+5V", Unit::volt, 5},
      {"-5 V", Unit::volt, -5},
      {"\u22125 V", Unit::volt, -5},
      {".5 V", Unit::volt, 0.5},
      {"0 A", Unit::ampere, 0},
      {"1fF", Unit::farad, 1e-15},
      {"4.7pF", Unit::farad, 4.7e-12},
      {"47uH", Unit::henry, 47e-6},
      {"47µH", Unit::henry, 47e-6},         // U+00B5
      {"47\u03bcH", Unit::henry, 47e-6},    // U+03BC
      {"3mH", Unit::henry, 3e-3},
      {"1 kΩ", Unit::ohm, 1e3},             // U+03A9
      {"1 k\u2126", Unit::ohm, 1e3},
      {"0.1ohm", Unit::ohm, 0.1},
      {"0.1 Ω", Unit::ohm, 0.1},
      {"10 Mohm", Unit::ohm, 1e7},
      {"10 mohm", Unit::ohm, 1e-2},
      {"10kohm", Unit::ohm, 1e4},
      {"10Kohm", Unit::ohm, 1e4},
      {"10K", Unit::ohm, 1e4},
      {"1GHz", Unit::hertz, 1e9},
      {"1THz", Unit::hertz, 1e12},
      {"100 khz", Unit::hertz, 1e5},
      {"4ns", Unit::second, 4e-9},
      {"8 h", Unit::second, 28800},
      {"5 min", Unit::second, 300},
      {"2650 1/s", Unit::per_second, 2650},
      {"2650/s", Unit::per_second, 2650},
      {"2.65 k/s", Unit::per_second, 2650},
      {"3 1/ms", Unit::per_second, 3000},
      {"1.5 rad", Unit::radian, 1.5},
      {"20 mrad", Unit::radian, 0.02},
      {"90 deg", Unit::radian, std::numbers::pi / 2},
      {"90°", Unit::radian, std::numbers::pi / 2},
      {"1 mWb", Unit::weber, 1e-3},
      {"1 Vs", Unit::weber, 1},
      {"2 uJ", Unit::joule, 2e-6},
      {"3 W", Unit::watt, 3},
      {"5 mS", Unit::siemens, 5e-3},
      {"23 degC", Unit::degree_celsius, 23},
      {"23 °C", Unit::degree_celsius, 23},
      {"23 C", Unit::degree_celsius, 23},
      {"-5 degC", Unit::degree_celsius, -5},
      {"3 K", Unit::kelvin, 3},
      {"3 degC", Unit::kelvin, 3},
      {"10A/V", Unit::ampere_per_volt, 10},
      {"100 mA/V", Unit::ampere_per_volt, 0.1},
      {"10", Unit::ampere_per_volt, 10},
      {"20 mT", Unit::tesla, 0.02},
      {"1 T", Unit::tesla, 1},
      {"1 T", Unit::ohm, 1e12},             // a prefix alone where a resistance is expected
      {"5 m", Unit::metre, 5},
      {"5 m", Unit::volt, 5e-3},
      {"5 mm", Unit::metre, 5e-3},
      {"10", Unit::one, 10},
      {"10x", Unit::one, 10},
      {"10 V/V", Unit::one, 10},
      {"1 %", Unit::one, 0.01},
      {"25 ppm", Unit::one, 25e-6},
      {"25ppm", Unit::one, 25e-6},
      {"0.0005", Unit::one, 0.0005},
  };
  for (const Typed& c : cases) {
    const auto value = parse_value(c.text, c.unit, "--x");
    ASSERT_TRUE(value) << c.text << ": " << value.error().finding;
    EXPECT_EQ(value->value, c.value) << c.text;
    EXPECT_EQ(value->unit, c.unit) << c.text;
    EXPECT_EQ(value->law, Law::unstated) << c.text;
    EXPECT_TRUE(std::isnan(value->standard_uncertainty)) << c.text;
  }
}

// IEC 60062 letter and digit code (from memory): the letter stands where the point would be.
TEST(ParseValue, ReadsTheLetterInPlaceOfThePoint) {
  const Typed cases[] = {
      {"4n7", Unit::farad, 4.7e-9},   {"4n7F", Unit::farad, 4.7e-9}, {"4n7 F", Unit::farad, 4.7e-9},
      {"p33", Unit::farad, 0.33e-12}, {"47u", Unit::henry, 47e-6},   {"2u2", Unit::henry, 2.2e-6},
      {"2µ2", Unit::henry, 2.2e-6},   {"4R7", Unit::ohm, 4.7},       {"0R1", Unit::ohm, 0.1},
      {"R47", Unit::ohm, 0.47},       {"47R", Unit::ohm, 47},        {"4k7", Unit::ohm, 4700},
      {"4k7 ohm", Unit::ohm, 4700},   {"4k7Ω", Unit::ohm, 4700},     {"1M5", Unit::ohm, 1.5e6},
      {"4R7ohm", Unit::ohm, 4.7},     {"-4R7", Unit::ohm, -4.7},     {"4n70", Unit::farad, 4.7e-9},
  };
  for (const Typed& c : cases) {
    const auto value = parse_value(c.text, c.unit, "--x");
    ASSERT_TRUE(value) << c.text << ": " << value.error().finding;
    EXPECT_EQ(value->value, c.value) << c.text;
  }
}

struct Tolerance {
  std::string_view text;
  Unit unit;
  Law law;
  double value, half_width, u;
};

TEST(ParseValue, ReadsTolerancesWithTheirLaw) {
  const double nan = std::nan("");
  const double r = std::sqrt(3.0);
  const Tolerance cases[] = {
      {"10nF±1%", Unit::farad, Law::rectangular, 1e-8, 1e-10, 1e-10 / r},
      {"10 nF ± 1 %", Unit::farad, Law::rectangular, 1e-8, 1e-10, 1e-10 / r},
      {"10nF+-1%", Unit::farad, Law::rectangular, 1e-8, 1e-10, 1e-10 / r},
      {"10nF+/-1%", Unit::farad, Law::rectangular, 1e-8, 1e-10, 1e-10 / r},
      {"10nF +/- 100ppm", Unit::farad, Law::rectangular, 1e-8, 1e-12, 1e-12 / r},
      {"10nF+-0.1nF", Unit::farad, Law::rectangular, 1e-8, 1e-10, 1e-10 / r},
      {"10nF±100p", Unit::farad, Law::rectangular, 1e-8, 1e-10, 1e-10 / r},
      {"10nF±0.1", Unit::farad, Law::rectangular, 1e-8, 1e-10, 1e-10 / r},
      {"10 ± 0.1 nF", Unit::farad, Law::rectangular, 1e-8, 1e-10, 1e-10 / r},
      {"4n7±5%", Unit::farad, Law::rectangular, 4.7e-9, 2.35e-10, 2.35e-10 / r},
      {"1e-8 ± 1e-10", Unit::farad, Law::rectangular, 1e-8, 1e-10, 1e-10 / r},
      {"-5V±1%", Unit::volt, Law::rectangular, -5, 0.05, 0.05 / r},
      {"0 V ± 2 mV", Unit::volt, Law::rectangular, 0, 2e-3, 2e-3 / r},
      {"10kohm±5%", Unit::ohm, Law::rectangular, 1e4, 500, 500 / r},
      {"10nF±0%", Unit::farad, Law::exact, 1e-8, nan, 0},
      {"10nF±0", Unit::farad, Law::exact, 1e-8, nan, 0},
      {"10nF±0pF(k=2)", Unit::farad, Law::exact, 1e-8, nan, 0},
      {"10.012nF±5pF(k=2)", Unit::farad, Law::normal, 10.012e-9, nan, 2.5e-12},
      {"10.012 nF ± 5 pF (k = 2)", Unit::farad, Law::normal, 10.012e-9, nan, 2.5e-12},
      {"10 nF ± 1 % (k=2.5)", Unit::farad, Law::normal, 1e-8, nan, 4e-11},
      {"10.0120(25)nF", Unit::farad, Law::normal, 10.012e-9, nan, 2.5e-12},
      {"10.0120(25) nF", Unit::farad, Law::normal, 10.012e-9, nan, 2.5e-12},
      {"10.0120(0.0025) nF", Unit::farad, Law::normal, 10.012e-9, nan, 2.5e-12},
      {"1.00120(25)e-8 F", Unit::farad, Law::normal, 10.012e-9, nan, 2.5e-12},
      {"470(310) uH", Unit::henry, Law::normal, 470e-6, nan, 310e-6},
      {"0.3(12) µH", Unit::henry, Law::normal, 0.3e-6, nan, 1.2e-6},
      {"1 ± 2 %", Unit::one, Law::rectangular, 1, 0.02, 0.02 / r},
      {"10±1%", Unit::one, Law::rectangular, 10, 0.1, 0.1 / r},
      {"10 ± 0.1", Unit::one, Law::rectangular, 10, 0.1, 0.1 / r},
      {"10A/V±2%", Unit::ampere_per_volt, Law::rectangular, 10, 0.2, 0.2 / r},
      {"23 ± 2 degC", Unit::degree_celsius, Law::rectangular, 23, 2, 2 / r},
      {"23 degC ± 2 K", Unit::degree_celsius, Law::rectangular, 23, 2, 2 / r},
      {"23 ± 2 K", Unit::degree_celsius, Law::rectangular, 23, 2, 2 / r},
      {"23 ± 2", Unit::degree_celsius, Law::rectangular, 23, 2, 2 / r},
      {"23(2) °C", Unit::degree_celsius, Law::normal, 23, nan, 2},
  };
  for (const Tolerance& c : cases) {
    const auto value = parse_value(c.text, c.unit, "--x");
    ASSERT_TRUE(value) << c.text << ": " << value.error().finding;
    EXPECT_EQ(value->law, c.law) << c.text;
    EXPECT_EQ(value->value, c.value) << c.text;
    if (std::isnan(c.half_width)) {
      EXPECT_TRUE(std::isnan(value->half_width)) << c.text;
    } else {
      EXPECT_NEAR(value->half_width, c.half_width, 1e-14 * std::abs(c.half_width)) << c.text;
    }
    EXPECT_NEAR(value->standard_uncertainty, c.u, 1e-14 * c.u) << c.text;
  }
}

// The value texts of the bench sheet, the part sheet and the options as the documentation shows them.
TEST(ParseValue, ReadsEveryValueTheDocumentationShows) {
  const std::pair<std::string_view, Unit> cases[] = {
      {"1 ± 2 %", Unit::one},           {"13 pF ± 2 pF", Unit::farad},
      {"10 Mohm", Unit::ohm},           {"0.1 ohm ± 1 %", Unit::ohm},
      {"2 nH ± 1 nH", Unit::henry},     {"4 ns ± 1 ns", Unit::second},
      {"25 ppm", Unit::one},            {"10.012 nF ± 5 pF (k=2)", Unit::farad},
      {"0.0005", Unit::one},            {"100 mV", Unit::volt},
      {"0 A", Unit::ampere},            {"23 ± 2 degC", Unit::degree_celsius},
      {"37.6 uH", Unit::henry},         {"56.4 uH", Unit::henry},
      {"100 kHz", Unit::hertz},         {"1.2 A", Unit::ampere},
      {"1 %", Unit::one},               {"20 %", Unit::one},
      {"10 mA", Unit::ampere},          {"3 degC", Unit::degree_celsius},
      {"3 degC", Unit::kelvin},         {"5 %", Unit::one},
      {"8 h", Unit::second},            {"2 s", Unit::second},
      {"1 V", Unit::volt},              {"0.2 %", Unit::one},
      {"1 mV", Unit::volt},             {"0 V", Unit::volt},
      {"1 us", Unit::second},           {"10±1%", Unit::one},
      {"10A/V±2%", Unit::ampere_per_volt}, {"4ns±1ns", Unit::second},
      {"10kohm±5%", Unit::ohm},         {"25ppm", Unit::one},
      {"1s", Unit::second},             {"10nF±0.1nF", Unit::farad},
  };
  for (const auto& [text, unit] : cases) {
    const auto value = parse_value(text, unit, "--x");
    EXPECT_TRUE(value) << text << ": " << value.error().finding;
  }
}

struct Refused {
  std::string_view text;
  Unit unit;
  Problem problem;
  std::string_view says;  // in the finding or the remedy
};

TEST(ParseValue, RefusesWithAReasonAndARemedy) {
  const Refused cases[] = {
      {"", Unit::farad, Problem::bad_number, "no value"},
      {"   ", Unit::farad, Problem::bad_number, "no value"},
      {"nF", Unit::farad, Problem::bad_number, "not a number"},
      {"nan", Unit::farad, Problem::bad_number, "not a number"},
      {"inf", Unit::farad, Problem::bad_number, "not a number"},
      {"-inf", Unit::farad, Problem::bad_number, "not a number"},
      {"4,7nF", Unit::farad, Problem::bad_number, "comma"},
      {"1,000 V", Unit::volt, Problem::bad_number, "comma"},
      {"1 000 V", Unit::volt, Problem::bad_number, "blank inside"},
      {"1.2.3 V", Unit::volt, Problem::bad_number, "two decimal points"},
      {"1e400 V", Unit::volt, Problem::bad_number, "range"},
      {"1e-400 V", Unit::volt, Problem::bad_number, "range"},
      {"1e99999999999 V", Unit::volt, Problem::bad_number, "range"},
      {"1e308 kV", Unit::volt, Problem::bad_number, "range"},
      {"1meg", Unit::ohm, Problem::ambiguous, "write M for mega"},
      {"1 Megohm", Unit::ohm, Problem::ambiguous, "write M for mega"},
      {"10nH", Unit::farad, Problem::wrong_unit, "an inductance (H), where a capacitance (F) is needed"},
      {"10 s", Unit::siemens, Problem::wrong_unit, "a time (s), where a conductance (S) is needed"},
      {"4R7", Unit::farad, Problem::wrong_unit, "a resistance (ohm), where a capacitance (F) is needed"},
      {"10nF±1nH", Unit::farad, Problem::wrong_unit, "an inductance"},
      {"1 %", Unit::hertz, Problem::wrong_unit, "a plain number, where a frequency (Hz) is needed"},
      {"10 A/V", Unit::one, Problem::wrong_unit, "a current per voltage"},
      {"100 mV/A", Unit::ampere_per_volt, Problem::bad_number, "10 A/V for 100 mV/A"},
      {"300 K", Unit::degree_celsius, Problem::wrong_unit, "a temperature difference"},
      {"23 kdegC", Unit::degree_celsius, Problem::wrong_unit, "no unit known"},
      {"23 ± 2 k", Unit::degree_celsius, Problem::wrong_unit, "no unit known"},
      {"10 uf", Unit::farad, Problem::wrong_unit, "small and capital letters matter"},
      {"10 mhz", Unit::hertz, Problem::wrong_unit, "no unit known"},
      {"10 furlong", Unit::metre, Problem::wrong_unit, "no unit known"},
      {"10nF trailing", Unit::farad, Problem::wrong_unit, "no unit known"},
      {"5m", Unit::one, Problem::wrong_unit, "a length"},
      {"5k", Unit::one, Problem::bad_number, "prefix"},
      {"10nF±", Unit::farad, Problem::bad_number, "nothing behind"},
      {"±1%", Unit::farad, Problem::bad_number, "no value"},
      {"10nF±1%±2%", Unit::farad, Problem::bad_number, "more than one"},
      {"10nF±-1%", Unit::farad, Problem::bad_number, "negative tolerance"},
      {"10nF±-0.1nF", Unit::farad, Problem::bad_number, "negative tolerance"},
      {"10nF±nan", Unit::farad, Problem::bad_number, "not a number"},
      {"10nF±1e400", Unit::farad, Problem::bad_number, "range"},
      {"0 V ± 1 %", Unit::volt, Problem::bad_number, "percentage of zero"},
      {"23 degC ± 1 %", Unit::degree_celsius, Problem::bad_number, "degC"},
      {"5 % ± 1 %", Unit::one, Problem::ambiguous, "percentage points"},
      {"10nF(k=2)", Unit::farad, Problem::bad_number, "no ±"},
      {"10nF±1%(k=0)", Unit::farad, Problem::bad_number, "coverage factor"},
      {"10nF±1%(k=-2)", Unit::farad, Problem::bad_number, "coverage factor"},
      {"10nF±1%(k=two)", Unit::farad, Problem::bad_number, "coverage factor"},
      {"10.0120(25)nF±1%", Unit::farad, Problem::bad_number, "parentheses and a ±"},
      {"10nF±1(2)pF", Unit::farad, Problem::bad_number, "parentheses in its tolerance"},
      {"10.0120(nF", Unit::farad, Problem::bad_number, "parentheses"},
      {"10.0120()nF", Unit::farad, Problem::bad_number, "parentheses"},
      {"10.0120(-25)nF", Unit::farad, Problem::bad_number, "parentheses"},
      {"10\x1b[31mnF", Unit::farad, Problem::bad_number, "\\x1b"},
      {"10\xffnF", Unit::farad, Problem::bad_number, "\\xff"},
      {"10 n\U0001f600", Unit::farad, Problem::bad_number, "character"},
      {"0x10", Unit::farad, Problem::wrong_unit, "no unit known"},
  };
  for (const Refused& c : cases) {
    const auto value = parse_value(c.text, c.unit, "bench.toml:7");
    ASSERT_FALSE(value) << c.text << " was read as " << value->value;
    const Error& error = value.error();
    EXPECT_EQ(error.problem, c.problem) << c.text << ": " << error.finding;
    EXPECT_THAT(error.finding + " / " + error.remedy, HasSubstr(c.says)) << c.text;
    EXPECT_EQ(error.place, "bench.toml:7");
    EXPECT_FALSE(error.remedy.empty()) << c.text;
    EXPECT_EQ(error.finding.find('\x1b'), std::string::npos);
  }
}

TEST(ParseValue, RefusesTextOfAnyLengthWithoutRepeatingAllOfIt) {
  const auto value = parse_value(std::string(1'000'000, '9'), Unit::volt, "--x");
  ASSERT_FALSE(value);
  EXPECT_LT(value.error().finding.size(), 200U);
}

TEST(ParsePlainNumber, UsesTheWholeTextOrNothing) {
  EXPECT_EQ(parse_plain_number("1.5e-3"), 1.5e-3);
  EXPECT_EQ(parse_plain_number("+2"), 2.0);
  EXPECT_EQ(parse_plain_number("-.5"), -0.5);
  for (const std::string_view bad : {"", "+", "-", "+-2", "1,5", "1.5 ", " 1.5", "1.5x", "nan", "inf", "-inf", "1e400",
                                     "0x10", "e5", "--1"}) {
    EXPECT_EQ(parse_plain_number(bad), std::nullopt) << bad;
  }
}

}  // namespace
}  // namespace coilassay

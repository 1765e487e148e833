// The fixture-set file: written, read back, and refused when it is damaged.
#include <gtest/gtest.h>

#include "acquire/fixture_set.h"

namespace coilassay {
namespace {

using namespace std::chrono_literals;

FixtureSet example(bool with_load) {
  FixtureSet set;
  set.name = "tweezers \"left\"";
  set.made = 2026y / 12 / 1;
  set.expires = 2027y / 3 / 1;
  set.connection = Connection::reflect;
  set.port = 2;
  set.frequency_hz = {1e3, 1.5e4, 1e6};
  set.open = {"open.s1p", "ab", {{1e7, -3e6}, {1e6, -2e5}, {10, -3183.098861837907}}};
  set.short_circuit = {"short.s1p", "cd", {{0.01, 6e-5}, {0.011, 9e-4}, {0.03, 0.0628}}};
  set.short_inductance = StatedValue::rectangular(0.4e-9, 0.1e-9, Unit::henry);
  set.short_resistance = StatedValue::normal(1e-3, 2e-4, Unit::ohm);
  set.open_capacitance = StatedValue::unstated(0, Unit::farad);
  if (with_load) {
    set.load = MeasuredStandard{"load.s1p", "ef", {{100.1, 0.2}, {100.2, 0.3}, {100.1, 5}}};
    set.load_value = StatedValue::rectangular(100, 0.1, Unit::ohm);
    set.load_inductance = StatedValue::exact(0, Unit::henry);
  }
  return set;
}

void expect_same(const StatedValue& a, const StatedValue& b) {
  EXPECT_EQ(a.value, b.value);
  EXPECT_EQ(a.unit, b.unit);
  EXPECT_EQ(a.law, b.law);
  if (a.law == Law::rectangular) {
    EXPECT_DOUBLE_EQ(a.half_width, b.half_width);
  }
  if (a.law == Law::normal) {
    EXPECT_DOUBLE_EQ(a.standard_uncertainty, b.standard_uncertainty);
  }
}

TEST(FixtureSet, ReadsBackWhatWasWritten) {
  for (const bool with_load : {false, true}) {
    const FixtureSet set = example(with_load);
    const auto read = parse_fixture_set(fixture_set_text(set), "set.toml");
    ASSERT_TRUE(read) << read.error().place << ": " << read.error().finding;
    EXPECT_EQ(read->name, set.name);
    EXPECT_EQ(read->made, set.made);
    EXPECT_EQ(read->expires, set.expires);
    EXPECT_EQ(read->port, 2u);
    EXPECT_EQ(read->frequency_hz, set.frequency_hz);
    EXPECT_EQ(read->open.z_ohm, set.open.z_ohm);
    EXPECT_EQ(read->short_circuit.z_ohm, set.short_circuit.z_ohm);
    EXPECT_EQ(read->short_circuit.sha256, "cd");
    expect_same(read->short_inductance, set.short_inductance);
    expect_same(*read->short_resistance, *set.short_resistance);
    expect_same(*read->open_capacitance, *set.open_capacitance);
    ASSERT_EQ(read->load.has_value(), with_load);
    if (!with_load) continue;
    EXPECT_EQ(read->load->z_ohm, set.load->z_ohm);
    expect_same(*read->load_value, *set.load_value);
    expect_same(*read->load_inductance, *set.load_inductance);
  }
}

/// The example with one thing replaced.
Error damaged(const std::string& from, const std::string& to) {
  std::string text = fixture_set_text(example(true));
  const std::size_t at = text.find(from);
  EXPECT_NE(at, std::string::npos) << from;
  text.replace(at, from.size(), to);
  const auto read = parse_fixture_set(text, "set.toml");
  EXPECT_FALSE(read) << to;
  return read ? Error{} : read.error();
}

TEST(FixtureSet, DamageIsNamed) {
  EXPECT_NE(damaged("expires", "expire").finding.find("expire"), std::string::npos);
  const Error without = damaged("inductance = \"4e-10", "induktance = \"4e-10");
  EXPECT_EQ(without.finding, "the short's own inductance is missing; it has no default, for conventions differ");
  EXPECT_EQ(damaged("\"reflect\"", "\"reflected\"").finding, "'reflected' is no connection");
  EXPECT_EQ(damaged("\"15000 ", "\"900 ").finding, "row 2 of grid.points: frequencies must be above zero and rise");
  EXPECT_EQ(damaged("100.1 0.2\"", "100.1\"").finding, "row 1 of grid.points has 6 numbers of 7");
  EXPECT_EQ(damaged("100.1 0.2\"", "100.1 x\"").finding, "row 1 of grid.points: 'x' is no number");
  EXPECT_EQ(damaged("value = \"100 ohm ± 0.1 ohm\"", "").finding, "the load's 'value' is missing");
  EXPECT_EQ(damaged("made = 2026-12-01", "").finding, "the day on which it was made is missing");
  EXPECT_EQ(damaged("[fixture]", "[fixtures]").problem, Problem::bad_sheet);
}

}  // namespace
}  // namespace coilassay

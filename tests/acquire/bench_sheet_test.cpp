#include "acquire/bench_sheet.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>
#include <unistd.h>

#include <cmath>
#include <filesystem>
#include <fstream>

namespace coilassay {
namespace {

using ::testing::HasSubstr;

/// A sheet in a folder of its own, removed with it.
class BenchSheet : public ::testing::Test {
 protected:
  BenchSheet() {
    folder_ = std::filesystem::temp_directory_path() / ("bench_sheet_test_" + std::to_string(::getpid()));
    std::filesystem::create_directories(folder_);
  }
  ~BenchSheet() override { std::filesystem::remove_all(folder_); }
  BenchSheet(const BenchSheet&) = delete;
  BenchSheet& operator=(const BenchSheet&) = delete;

  Result<BenchSetup> read(const std::string& text) const {
    std::ofstream(path()) << text;
    return read_bench_sheet(path());
  }
  std::string path() const { return (folder_ / "bench.toml").string(); }

  BenchSetup good(const std::string& text) const {
    auto setup = read(text);
    EXPECT_TRUE(setup) << (setup ? "" : setup.error().place + ": " + setup.error().finding);
    return setup ? *setup : BenchSetup{};
  }

  void refuses(const std::string& text, Problem problem, int line, const std::string& word) const {
    const auto setup = read(text);
    ASSERT_FALSE(setup) << text;
    EXPECT_EQ(name(setup.error().problem), name(problem)) << text;
    EXPECT_EQ(setup.error().place, path() + ":" + std::to_string(line)) << text;
    EXPECT_THAT(setup.error().finding, HasSubstr(word)) << text;
    EXPECT_FALSE(setup.error().remedy.empty()) << text;
  }

  std::filesystem::path folder_;
};

TEST_F(BenchSheet, SaysHowWellAnAnalyserKnowsItsImpedances) {
  const BenchSetup setup = good(
      "[impedance]\naccuracy = \"0.1 %\"\nseries_floor = \"2 mohm\"\nparallel_floor = \"10 nS\"\nscattering = \"0.002\"\n");
  EXPECT_NEAR(setup.impedance.ratio->value, 1e-3, 1e-18);
  EXPECT_NEAR(setup.impedance.series_floor->value, 2e-3, 1e-18);
  EXPECT_NEAR(setup.impedance.parallel_floor->value, 10e-9, 1e-22);
  EXPECT_NEAR(setup.impedance.scattering->value, 2e-3, 1e-18);
  BenchSetup over;
  over.impedance.ratio = StatedValue::unstated(0.01, Unit::one);
  EXPECT_EQ(overridden(setup, over).impedance.ratio->value, 0.01);
  EXPECT_TRUE(overridden(setup, over).impedance.scattering);
}

constexpr const char* kEverything = R"toml([voltage]
column = "CH1"
low_column = 3
gain = "1 ± 2 %"
full_scale = "5 V"
input_capacitance = "13 pF ± 2 pF"
input_resistance = "10 Mohm"
[current]
column = "CH2"
low_column = "CH3"
gain = 2
shunt = "0.1 ohm ± 1 %"
full_scale = "0.5 V"
shunt_inductance = "2 nH ± 1 nH"
skew = "4 ns ± 1 ns"
probe_corner = "100 Hz"
[timebase]
tolerance = "25 ppm"
[[capacitor]]
value = "10.012 nF ± 5 pF (k=2)"
dissipation_factor = "0.0005"
[[capacitor]]
value = 4.7e-9
[across]
resistance = "10 kohm ± 5 %"
capacitance = "30 pF"
[winding]
resistance = "0.28 ohm ± 1 %"
[stimulus]
level = "100 mV"
bias = "-0.5 A"
[room]
temperature = "23 ± 2 degC"
[fixture]
set = "fixtures/tweezers.toml"
[file]
delimiter = ";"
decimal = ","
sample_interval = "20 ns"
columns = ["time [us]", "CH1 [V]", "-"]
skip = 3
[[equipment]]
id = "DMM-3"
certificate = "SBW-114"
calibrated = 2026-05-01
due = 2027-05-01
[[equipment]]
id = "C-10n"
)toml";

TEST_F(BenchSheet, EveryKeyArrivesInSI) {
  const BenchSetup setup = good(kEverything);
  EXPECT_EQ(setup.voltage.column, "CH1");
  EXPECT_EQ(setup.voltage.low_column, "3");
  EXPECT_EQ(setup.voltage.gain->value, 1);
  EXPECT_NEAR(setup.voltage.gain->half_width, 0.02, 1e-15);
  EXPECT_EQ(setup.voltage.full_scale->value, 5);
  EXPECT_EQ(setup.voltage.input_capacitance->value, 13e-12);
  EXPECT_EQ(setup.voltage.input_capacitance->law, Law::rectangular);
  EXPECT_EQ(setup.voltage.input_resistance->value, 10e6);
  EXPECT_EQ(setup.voltage.input_resistance->law, Law::unstated);
  EXPECT_EQ(setup.current.column, "CH2");
  EXPECT_EQ(setup.current.low_column, "CH3");
  EXPECT_EQ(setup.current.gain->value, 2);
  EXPECT_EQ(setup.current.gain->unit, Unit::one);
  EXPECT_EQ(setup.current.shunt->value, 0.1);
  EXPECT_EQ(setup.current.full_scale->unit, Unit::volt);
  EXPECT_EQ(setup.current.shunt_inductance->value, 2e-9);
  EXPECT_EQ(setup.current.skew->value, 4e-9);
  EXPECT_EQ(setup.current.probe_corner->value, 100);
  EXPECT_NEAR(setup.timebase->value, 25e-6, 1e-20);
  ASSERT_EQ(setup.capacitors.size(), 2U);
  EXPECT_NEAR(setup.capacitors[0].value.value, 10.012e-9, 1e-22);
  EXPECT_EQ(setup.capacitors[0].value.law, Law::normal);
  EXPECT_NEAR(setup.capacitors[0].value.standard_uncertainty, 2.5e-12, 1e-25);
  EXPECT_EQ(setup.capacitors[0].dissipation_factor->value, 0.0005);
  EXPECT_EQ(setup.capacitors[1].value.value, 4.7e-9);
  EXPECT_FALSE(setup.capacitors[1].dissipation_factor);
  EXPECT_EQ(setup.across_resistance->value, 10e3);
  EXPECT_EQ(setup.across_capacitance->value, 30e-12);
  EXPECT_EQ(setup.winding_resistance->value, 0.28);
  EXPECT_EQ(setup.level->value, 0.1);
  EXPECT_EQ(setup.bias->value, -0.5);
  EXPECT_EQ(setup.temperature->value, 23);
  EXPECT_EQ(setup.temperature->half_width, 2);
  EXPECT_EQ(setup.fixture_set, (folder_ / "fixtures/tweezers.toml").string());
  EXPECT_EQ(setup.reading.delimiter, ';');
  EXPECT_EQ(setup.reading.decimal, ',');
  EXPECT_EQ(setup.reading.sample_interval_s, 20e-9);
  EXPECT_EQ(setup.reading.columns, (std::vector<std::string>{"time [us]", "CH1 [V]", "-"}));
  EXPECT_EQ(setup.reading.skip, 3U);
  ASSERT_EQ(setup.equipment.size(), 2U);
  EXPECT_EQ(setup.equipment[0].certificate, "SBW-114");
  EXPECT_EQ(setup.equipment[0].calibrated, "2026-05-01");
  EXPECT_EQ(setup.equipment[0].due, "2027-05-01");
  EXPECT_EQ(setup.equipment[1].id, "C-10n");
  EXPECT_EQ(setup.equipment[1].due, "");
}

TEST_F(BenchSheet, AnEmptySheetStatesNothing) {
  const BenchSetup setup = good("");
  EXPECT_FALSE(setup.voltage.column);
  EXPECT_FALSE(setup.timebase);
  EXPECT_TRUE(setup.capacitors.empty());
  EXPECT_FALSE(setup.reading.delimiter);
}

TEST_F(BenchSheet, ACurrentProbeHasItsGainInAmperesPerVolt) {
  const BenchSetup setup = good("[current]\ngain = \"10 A/V ± 2 %\"\nfull_scale = \"0.4 V\"\n");
  EXPECT_EQ(setup.current.gain->unit, Unit::ampere_per_volt);
  EXPECT_EQ(setup.current.gain->value, 10);
  EXPECT_EQ(good("[current]\nfull_scale = \"4 A\"\n").current.full_scale->unit, Unit::ampere);
  EXPECT_EQ(good("[current]\nfull_scale = \"4 V\"\n").current.full_scale->unit, Unit::volt);
  refuses("[current]\ngain = \"10 V\"\n", Problem::wrong_unit, 2, "");
  refuses("[current]\nshunt = \"1 ohm\"\nfull_scale = \"4 A\"\n", Problem::wrong_unit, 3, "");
  refuses("[current]\ngain = \"10 A/V\"\nshunt = \"1 ohm\"\n", Problem::bad_sheet, 2, "cannot be both");
}

TEST_F(BenchSheet, AnUnknownKeyIsNamedWithItsLine) {
  refuses("[voltage]\ncolumn = \"CH1\"\ncolum = \"CH2\"\n", Problem::bad_sheet, 3, "colum");
  refuses("[[capacitor]]\nvalue = \"1 nF\"\ntolerance = \"1 %\"\n", Problem::bad_sheet, 3, "tolerance");
  refuses("[probe]\nx = 1\n", Problem::bad_sheet, 1, "probe");
  refuses("[voltage]\nshunt = \"1 ohm\"\n", Problem::bad_sheet, 2, "shunt");
  // Misspelt, so the needed one is missing too: the misspelling is what helps.
  refuses("[[capacitor]]\nvalu = \"1 nF\"\n", Problem::bad_sheet, 2, "valu");
}

TEST_F(BenchSheet, AUnitOfTheWrongKindIsRefused) {
  refuses("[[capacitor]]\nvalue = \"10 nH\"\n", Problem::wrong_unit, 2, "");
  refuses("[voltage]\ninput_resistance = \"10 pF\"\n", Problem::wrong_unit, 2, "");
  refuses("[voltage]\ngain = \"10 A/V\"\n", Problem::wrong_unit, 2, "");
  refuses("[room]\ntemperature = \"23 V\"\n", Problem::wrong_unit, 2, "");
}

TEST_F(BenchSheet, WhatNoBenchCanHaveIsRefused) {
  refuses("[[capacitor]]\nvalue = \"-10 nF\"\n", Problem::bad_number, 2, "capacitor.value");
  refuses("[[capacitor]]\nvalue = 0\n", Problem::bad_number, 2, "zero");
  refuses("[[capacitor]]\nvalue = \"10 nF ± 100 %\"\n", Problem::bad_number, 2, "tolerance");
  refuses("[[capacitor]]\nvalue = \"10 nF\"\ndissipation_factor = \"-0.001\"\n", Problem::bad_number, 3, "negative");
  refuses("[[capacitor]]\nvalue = \"10 nF\"\ndissipation_factor = 2\n", Problem::bad_number, 3, "resistor");
  refuses("[[capacitor]]\nvalue = \"10 nF\"\ndissipation_factor = \"0.001 ± 0.002\"\n", Problem::bad_number, 3,
          "below zero");
  refuses("[[capacitor]]\ndissipation_factor = 0.001\n", Problem::bad_sheet, 1, "value");
  refuses("[across]\nresistance = \"0 ohm\"\n", Problem::bad_number, 2, "zero");
  refuses("[across]\n\ncapacitance = \"-1 pF\"\n", Problem::bad_number, 3, "negative");
  refuses("[winding]\nresistance = -0.1\n", Problem::bad_number, 2, "winding.resistance");
  refuses("[voltage]\ninput_resistance = \"0 ohm\"\n", Problem::bad_number, 2, "zero");
  refuses("[voltage]\ngain = 0\n", Problem::bad_number, 2, "gain");
  refuses("[current]\nshunt = \"0.1 ohm ± 120 %\"\n", Problem::bad_number, 2, "tolerance");
  refuses("[current]\nprobe_corner = \"-1 Hz\"\n", Problem::bad_number, 2, "probe_corner");
  refuses("[impedance]\naccuracy = \"0.1 ± 0.01\"\n", Problem::bad_sheet, 2, "half-width");
  refuses("[impedance]\naccuracy = 2\n", Problem::bad_number, 2, "whole value");
  refuses("[impedance]\nseries_floor = \"1 nS\"\n", Problem::wrong_unit, 2, "");
  refuses("[timebase]\ntolerance = \"-25 ppm\"\n", Problem::bad_number, 2, "negative");
  refuses("[timebase]\ntolerance = 25\n", Problem::bad_number, 2, "no clock");
  refuses("[timebase]\ntolerance = \"0.01 ± 0.001\"\n", Problem::bad_sheet, 2, "half-width");
  refuses("[stimulus]\nlevel = \"-1 V\"\n", Problem::bad_number, 2, "level");
  refuses("[room]\ntemperature = \"-300 degC\"\n", Problem::bad_number, 2, "absolute zero");
  refuses("[[equipment]]\nid = \"DMM-3\"\ncalibrated = 2026-05-01\ndue = 2025-05-01\n", Problem::bad_sheet, 4, "due");
  refuses("[[equipment]]\ncertificate = \"x\"\n", Problem::bad_sheet, 1, "id");
  refuses("[[equipment]]\nid = \"\"\n", Problem::bad_sheet, 2, "empty");
}

TEST_F(BenchSheet, StraysAndAnInvertedProbeArePossible) {
  const BenchSetup setup = good(
      "[voltage]\ngain = -10\ninput_capacitance = \"10 pF ± 10 pF\"\n[across]\ncapacitance = 0\n"
      "[[capacitor]]\nvalue = \"1 nF\"\ndissipation_factor = \"0.001 ± 0.001\"\n[current]\nskew = \"-3 ns ± 5 ns\"\n");
  EXPECT_EQ(setup.voltage.gain->value, -10);
  EXPECT_EQ(setup.across_capacitance->value, 0);
  EXPECT_EQ(setup.current.skew->value, -3e-9);
}

TEST_F(BenchSheet, WrongTypesAreRefused) {
  refuses("[voltage]\ncolumn = true\n", Problem::bad_sheet, 2, "column");
  refuses("[voltage]\ncolumn = 0\n", Problem::bad_sheet, 2, "count from 1");
  refuses("[voltage]\ncolumn = \"\"\n", Problem::bad_sheet, 2, "empty");
  refuses("[voltage]\ncolumn = 2\nlow_column = \"2\"\n", Problem::bad_sheet, 3, "same");
  refuses("[capacitor]\nvalue = \"1 nF\"\n", Problem::bad_sheet, 1, "array of tables");
  refuses("voltage = 3\n", Problem::bad_sheet, 1, "table");
  refuses("[[equipment]]\nid = \"DMM-3\"\ncalibrated = \"2026-05-01\"\n", Problem::bad_sheet, 3, "date");
  refuses("[voltage\n", Problem::bad_sheet, 1, "TOML");
}

TEST_F(BenchSheet, TheReadingKeyTakesSingleCharactersAndTheirNames) {
  EXPECT_EQ(good("[file]\ndelimiter = \"tab\"\n").reading.delimiter, '\t');
  EXPECT_EQ(good("[file]\ndelimiter = \"\\t\"\n").reading.delimiter, '\t');
  EXPECT_EQ(good("[file]\ndelimiter = \"space\"\n").reading.delimiter, ' ');
  EXPECT_EQ(good("[file]\ndelimiter = \"|\"\n").reading.delimiter, '|');
  refuses("[file]\nskip = -1\n", Problem::bad_number, 2, "negative");
  refuses("[file]\nsample_interval = \"0 s\"\n", Problem::bad_number, 2, "zero");
  refuses("[file]\nsample_interval = \"1 us ± 1 %\"\n", Problem::bad_sheet, 2, "clock");
  refuses("[file]\ndelimiter = \";;\"\n", Problem::bad_sheet, 2, "';;'");
  refuses("[file]\ndelimiter = \"5\"\n", Problem::bad_sheet, 2, "'5'");
  refuses("[file]\ndelimiter = \".\"\n", Problem::bad_sheet, 2, "'.'");
  refuses("[file]\ndecimal = \"'\"\n", Problem::bad_sheet, 2, "decimal sign");
  refuses("[file]\ndelimiter = \",\"\ndecimal = \",\"\n", Problem::bad_sheet, 3, "same");
}

TEST_F(BenchSheet, AFixtureSetIsRelativeToTheSheet) {
  EXPECT_EQ(good("[fixture]\nset = \"/bench/open.toml\"\n").fixture_set, "/bench/open.toml");
  EXPECT_EQ(good("[fixture]\nset = \"../open.toml\"\n").fixture_set, (folder_.parent_path() / "open.toml").string());
}

TEST_F(BenchSheet, AMissingSheetSaysSo) {
  const auto setup = read_bench_sheet((folder_ / "none.toml").string());
  ASSERT_FALSE(setup);
  EXPECT_EQ(setup.error().problem, Problem::unreadable);
}

TEST_F(BenchSheet, TheCommandLineReplacesItemByItem) {
  const BenchSetup base = good(kEverything);
  EXPECT_EQ(overridden(base, {}).voltage.column, "CH1");
  EXPECT_EQ(overridden(base, {}).capacitors.size(), 2U);
  EXPECT_EQ(overridden(base, {}).reading.delimiter, ';');

  BenchSetup over;
  over.voltage.input_capacitance = StatedValue::exact(9e-12, Unit::farad);
  over.capacitors.push_back({StatedValue::exact(1e-9, Unit::farad), std::nullopt});
  over.temperature = StatedValue::exact(30, Unit::degree_celsius);
  over.reading.threads = 7;
  over.reading.decimal = '.';
  const BenchSetup setup = overridden(base, over);
  EXPECT_EQ(setup.voltage.input_capacitance->value, 9e-12);
  EXPECT_EQ(setup.voltage.input_resistance->value, 10e6);  // not stated over it
  ASSERT_EQ(setup.capacitors.size(), 1U);                  // as a whole
  EXPECT_FALSE(setup.capacitors[0].dissipation_factor);
  EXPECT_EQ(setup.temperature->value, 30);
  EXPECT_EQ(setup.reading.threads, 7U);
  EXPECT_EQ(setup.reading.delimiter, ';');
  EXPECT_EQ(setup.reading.decimal, '.');
  EXPECT_EQ(setup.reading.sample_interval_s, 20e-9);

  // Every item of a sheet laid over nothing arrives.
  const BenchSetup copy = overridden({}, base);
  EXPECT_EQ(copy.voltage.low_column, base.voltage.low_column);
  EXPECT_EQ(copy.voltage.gain->value, 1);
  EXPECT_EQ(copy.voltage.full_scale->value, 5);
  EXPECT_EQ(copy.current.column, "CH2");
  EXPECT_EQ(copy.current.shunt->value, 0.1);
  EXPECT_EQ(copy.current.shunt_inductance->value, 2e-9);
  EXPECT_EQ(copy.current.skew->value, 4e-9);
  EXPECT_EQ(copy.current.probe_corner->value, 100);
  EXPECT_TRUE(copy.timebase);
  EXPECT_EQ(copy.across_resistance->value, 10e3);
  EXPECT_EQ(copy.across_capacitance->value, 30e-12);
  EXPECT_EQ(copy.winding_resistance->value, 0.28);
  EXPECT_EQ(copy.level->value, 0.1);
  EXPECT_EQ(copy.bias->value, -0.5);
  EXPECT_EQ(copy.fixture_set, base.fixture_set);
  EXPECT_EQ(copy.equipment.size(), 2U);
}

Capture three_columns() {
  Capture capture;
  capture.source.name = "ring.csv";
  capture.time = {0, 1e-6, {}};
  for (const char* channel : {"CH1", "CH2", "4"}) {
    Channel c;
    c.name = channel;
    c.column = capture.channels.size() + 2;
    c.samples = {0, 1};
    capture.channels.push_back(c);
  }
  capture.channels[0].unit = Unit::volt;
  capture.channels[0].unit_stated = true;
  return capture;
}

TEST(FindChannel, ANameComesBeforeAPosition) {
  const Capture capture = three_columns();
  EXPECT_EQ(find_channel(capture, "CH2", "--voltage").value(), 1U);
  EXPECT_EQ(find_channel(capture, "2", "--voltage").value(), 0U);  // the time is column 1
  EXPECT_EQ(find_channel(capture, "4", "--voltage").value(), 2U);  // a name
  EXPECT_EQ(find_channel(capture, "3", "--voltage").value(), 1U);
}

TEST(FindChannel, SaysWhatTheFileHasAndWhatIsNear) {
  const Capture capture = three_columns();
  for (const char* column : {"ch1", "1", "5", "current", "", "02"}) {
    const auto found = find_channel(capture, column, "--voltage");
    ASSERT_FALSE(found) << column;
    EXPECT_EQ(found.error().problem, Problem::missing_column);
    EXPECT_EQ(found.error().place, "ring.csv");
    EXPECT_THAT(found.error().finding, HasSubstr("1: time, 2: CH1 [V], 3: CH2, 4: 4"));
    EXPECT_THAT(found.error().remedy, HasSubstr("--voltage"));
  }
  EXPECT_THAT(find_channel(capture, "CH1 ", "--voltage").error().remedy, HasSubstr("did you mean --voltage CH1?"));
  EXPECT_THAT(find_channel(Capture{}, "CH1", "--voltage").error().finding, HasSubstr("no channel"));
}

TEST(FindChannel, TwoColumnsOfOneNameAreAmbiguous) {
  Capture capture = three_columns();
  capture.channels[1].name = "CH1";
  const auto found = find_channel(capture, "CH1", "--current");
  ASSERT_FALSE(found);
  EXPECT_EQ(found.error().problem, Problem::ambiguous);
  EXPECT_THAT(found.error().remedy, HasSubstr("--current 2"));
}

}  // namespace
}  // namespace coilassay

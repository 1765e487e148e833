// A saturation test from capture file to result, through the program itself.
#include <gmock/gmock.h>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

nlohmann::json simulate_ramp(const std::string& file, const std::vector<std::string>& parameters = {}) {
  std::vector<std::string> arguments = {"simulate", "ramp", "-o", file, "--truth", file + ".json"};
  arguments.insert(arguments.end(), parameters.begin(), parameters.end());
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, 0) << end.error;
  const std::string truth = contents_of(file + ".json");
  EXPECT_EQ(schema_trouble(truth, "truth"), "");
  return nlohmann::json::parse(truth);
}

const std::vector<std::string> kCoarse = {"--noise", "50mV", "--current-noise", "80mA", "--bits", "8"};

TEST(Ramp, GivesTheSaturationWithIntervalsThatHoldTheTruth) {
  const TemporaryFolder folder;
  const std::string file = folder / "ramp.csv";
  const auto truth = simulate_ramp(file, kCoarse).at("truth");
  const auto result = measured_json({"ramp", file, "--dcr", "50mohm±5%"});
  for (const char* symbol : {"L_0", "I_sat_10", "I_sat_20", "I_sat_30", "E_max"}) {
    EXPECT_TRUE(covers(result, symbol, truth.at(symbol).get<double>()));
  }
  EXPECT_EQ(result.at("test"), "ramp");
  EXPECT_EQ(result.at("quantities").at("I_sat_30").at("definition"), "ramp_incremental");
  for (const char* column : {"current_A", "incremental_H", "incremental_U_H", "secant_H", "flux_Wb"}) {
    EXPECT_EQ(result.at("curve").at(column).size(), 101u) << column;
  }
}

// A sharp core whose first descent runs into curves that do not rise everywhere: it once ended as "not reached", with limits
// above the truth.
TEST(Ramp, ASharpKneeIsFoundAlsoFromAPoorStart) {
  const TemporaryFolder folder;
  for (const char* seed : {"2", "17"}) {
    std::vector<std::string> sharp = kCoarse;
    sharp.insert(sharp.end(), {"--freewheel", "--core", "ferrite", "--seed", seed});
    const std::string file = folder / (std::string(seed) + ".csv");
    const auto truth = simulate_ramp(file, sharp).at("truth");
    const auto result = measured_json({"ramp", file, "--exact-bench"});
    EXPECT_LT(result.at("model").at("reduced_chi_square").get<double>(), 3) << seed;
    EXPECT_NEAR(result.at("quantities").at("I_sat_30").at("value").get<double>(), truth.at("I_sat_30").get<double>(), 0.05) << seed;
    for (const auto& finding : result.at("findings")) EXPECT_NE(finding.at("code"), "knee_not_reached") << seed;
  }
}

TEST(Ramp, PulsesStandOneByOneAndTheResistanceIsFound) {
  const TemporaryFolder folder;
  const std::string file = folder / "pulses.csv";
  simulate_ramp(file, {"--pulses", "3", "--diode-voltage", "4", "--samples", "30000", "--noise", "5mV", "--current-noise", "8mA",
                       "--bits", "12"});
  const auto result = measured_json({"ramp", file, "--exact-bench"});
  ASSERT_EQ(result.at("pulses").size(), 3u);
  EXPECT_EQ(result.at("pulses").at(0).at("index"), 1);
  EXPECT_TRUE(result.at("pulses").at(2).contains("L_0"));
  EXPECT_TRUE(result.at("quantities").contains("R_dc"));
}

TEST(Ramp, ReadsWellAndWritesFigureAndNetlist) {
  const TemporaryFolder folder;
  const std::string file = folder / "ramp.csv";
  simulate_ramp(file, kCoarse);
  const ProgramEnd end = run_program_process({"ramp", file, "--dcr", "50mohm", "--figure", folder / "ramp.svg", "--netlist",
                                              folder / "coil.cir"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("I_sat_30"));
  EXPECT_THAT(end.out, HasSubstr("µH"));
  EXPECT_THAT(contents_of(folder / "ramp.svg"), HasSubstr("<svg"));
  EXPECT_THAT(contents_of(folder / "coil.cir"), HasSubstr(".subckt ramp a b"));
}

TEST(Ramp, ARampThatNeverRisesIsRefused) {
  const TemporaryFolder folder;
  const std::string file = folder / "ramp.csv";
  simulate_ramp(file, kCoarse);
  const auto swapped = measured_json({"ramp", file, "--voltage", "CH2", "--current", "CH1", "--current-gain", "1"}, 2);
  EXPECT_EQ(swapped.at("schema"), "coilassay.error/1");   // CH2 is in A
  std::string flat = "time [s],CH1 [V],CH2 [A]\n";
  for (int i = 0; i < 1000; ++i) flat += std::to_string(i * 1e-6) + (i < 100 ? ",0,0\n" : ",10,0\n");
  const auto result = measured_json({"ramp", folder.file("flat.csv", flat), "--dcr", "1ohm"}, 3);
  EXPECT_FALSE(result.at("quantities").contains("L_0"));
  EXPECT_EQ(result.at("findings").at(0).at("code"), "no_ramp");
}

}  // namespace
}  // namespace coilassay::test

// A steady sine from capture file to result, through the program itself.
#include <gmock/gmock.h>

#include <cmath>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

nlohmann::json simulate_sine(const std::string& file, const std::vector<std::string>& parameters = {}) {
  std::vector<std::string> arguments = {"simulate", "sine", "-o", file, "--truth", file + ".json"};
  arguments.insert(arguments.end(), parameters.begin(), parameters.end());
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, 0) << end.error;
  const std::string truth = contents_of(file + ".json");
  EXPECT_EQ(schema_trouble(truth, "truth"), "");
  return nlohmann::json::parse(truth);
}

const std::vector<std::string> kShunt = {"--shunt", "1ohm",  "--shunt-inductance", "4nH",   "--skew", "5ns",
                                         "--noise", "2mV",   "--current-noise",    "30uA", "--bits", "10"};

TEST(Sine, GivesTheImpedanceWithIntervalsThatHoldTheTruth) {
  const TemporaryFolder folder;
  const std::string file = folder / "sine.csv";
  const auto truth = simulate_sine(file, kShunt).at("truth");
  const auto result = measured_json({"sine", file, "--current", "CH2", "--shunt", "1ohm±1%", "--shunt-inductance", "4nH±2nH",
                                     "--skew", "5ns±2ns", "--voltage-gain", "1±1%", "--timebase", "25ppm"});
  for (const char* symbol : {"f", "Z", "phi", "R_s", "X_s", "L_s", "R_p", "L_p", "Q", "D", "P"}) {
    EXPECT_TRUE(covers(result, symbol, truth.at(symbol).get<double>()));
  }
  EXPECT_EQ(result.at("test"), "sine");
  EXPECT_NEAR(result.at("conditions").at("frequency_Hz").get<double>(), 10e3, 1);
}

TEST(Sine, ReadsWellOnATerminalAndDrawsItsFigure) {
  const TemporaryFolder folder;
  const std::string file = folder / "sine.csv";
  simulate_sine(file, kShunt);
  const ProgramEnd end = run_program_process({"sine", file, "--shunt", "1ohm±1%", "--figure", folder / "sine.svg"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("L_s"));
  EXPECT_THAT(end.out, HasSubstr("R_s"));
  EXPECT_THAT(contents_of(folder / "sine.svg"), HasSubstr("<svg"));
}

TEST(Sine, SeveralBiasesGiveATableAndTheSaturationCurrents) {
  const TemporaryFolder folder;
  std::vector<std::string> arguments = {"sine"}, biases;
  for (const char* bias : {"0", "1", "2", "3"}) {
    const std::string file = folder / (std::string(bias) + ".csv");
    simulate_sine(file, {"--bias", bias, "--saturation", "0.08", "--noise", "1mV", "--current-noise", "20uA"});
    arguments.push_back(file);
    biases.insert(biases.end(), {"--bias", std::string(bias) + "A±1%"});
  }
  biases[1] = "0A";
  arguments.insert(arguments.end(), biases.begin(), biases.end());
  arguments.insert(arguments.end(), {"--figure", folder / "bias.svg"});
  const auto result = measured_json(arguments);
  EXPECT_EQ(result.at("points").size(), 4U);
  EXPECT_TRUE(covers(result, "I_sat_20", std::sqrt(0.25 / 0.08)));
  EXPECT_EQ(result.at("quantities").at("I_sat_20").at("definition"), "bias_small_signal");
  EXPECT_THAT(contents_of(folder / "bias.svg"), HasSubstr("<svg"));
}

TEST(Sine, TheSkewOfAResistorGoesToANewSheetAndIsUsedFromThere) {
  const TemporaryFolder folder;
  const std::string resistor = folder / "50r.csv", coil = folder / "coil.csv", sheet = folder / "skew.toml";
  const std::vector<std::string> bench = {"--shunt", "1ohm",  "--skew",          "8ns",  "--frequency", "500kHz",
                                          "--noise", "1mV", "--current-noise", "30uA", "--samples",   "20000"};
  std::vector<std::string> first = bench, second = bench;
  first.insert(first.end(), {"--resistance", "50", "--inductance", "1pH"});
  second.insert(second.end(), {"--resistance", "2", "--inductance", "10uH"});
  simulate_sine(resistor, first);
  const auto truth = simulate_sine(coil, second).at("truth");
  const std::vector<std::string> how = {"--shunt",      "1ohm±1%", "--shunt-inductance",    "0.1nH±0.1nH",
                                        "--of-resistor", "50ohm±1%", "--resistor-inductance", "0.1nH±0.1nH"};
  std::vector<std::string> measure = {"sine", resistor, "--bench-out", sheet};
  measure.insert(measure.end(), how.begin(), how.end());
  const auto found = measured_json(measure);
  EXPECT_TRUE(covers(found, "skew", 8e-9));
  EXPECT_THAT(contents_of(sheet), HasSubstr("skew = \"8."));
  const auto result = measured_json({"sine", coil, "--bench", sheet});
  EXPECT_TRUE(covers(result, "R_s", truth.at("R_s").get<double>()));
  // A sheet is never edited.
  const auto refused = measured_json(measure, 2);
  EXPECT_EQ(refused.at("problem"), "cannot_write");
}

TEST(Sine, BadInputIsRefusedInWords) {
  const TemporaryFolder folder;
  const std::string file = folder / "sine.csv";
  simulate_sine(file, kShunt);
  const auto no_shunt = measured_json({"sine", file}, 2);
  EXPECT_THAT(no_shunt.at("remedy").get<std::string>(), HasSubstr("--shunt"));
  EXPECT_EQ(measured_json({"sine", file, "--shunt", "1ohm", "--bias", "1A", "--bias", "2A"}, 2).at("problem"), "usage");
  EXPECT_EQ(measured_json({"sine", file, "--shunt", "1ohm", "--bench-out", folder / "x.toml"}, 2).at("problem"), "usage");
  EXPECT_EQ(measured_json({"sine", file, "--current-gain", "0"}, 2).at("problem"), "bad_number");
  // Nothing but noise: a result that says why, exit 3.
  const std::string quiet = folder / "quiet.csv";
  simulate_sine(quiet, {"--amplitude", "0", "--noise", "1mV", "--current-noise", "1mA"});
  const auto refused = measured_json({"sine", quiet}, 3);
  EXPECT_FALSE(refused.at("quantities").contains("Z"));
  EXPECT_EQ(refused.at("findings").at(0).at("severity"), "refusal");
}

}  // namespace
}  // namespace coilassay::test

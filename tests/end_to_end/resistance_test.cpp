// From a table of four-wire readings to a winding resistance, through the program itself.
#include <gmock/gmock.h>

#include <string>
#include <vector>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::Contains;
using testing::HasSubstr;

nlohmann::json simulate_readings(const std::string& file, const std::vector<std::string>& parameters = {}) {
  std::vector<std::string> arguments = {"simulate", "resistance", "-o", file, "--truth", file + ".json"};
  arguments.insert(arguments.end(), parameters.begin(), parameters.end());
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, 0) << end.error;
  const std::string truth = contents_of(file + ".json");
  EXPECT_EQ(schema_trouble(truth, "truth"), "");
  return nlohmann::json::parse(truth);
}

std::vector<std::string> codes_of(const nlohmann::json& result) {
  std::vector<std::string> codes;
  for (const auto& finding : result.at("findings")) codes.push_back(finding.at("code"));
  return codes;
}

const std::vector<std::string> kMeters = {"--noise", "2uV", "--thermal-offset", "9uV", "--digit", "1uV", "--current-digit", "10uA"};

TEST(Resistance, GivesTheWindingsResistanceAndThatAt20Degrees) {
  const TemporaryFolder folder;
  const std::string file = folder / "readings.csv";
  const auto truth = simulate_readings(file, kMeters).at("truth");
  const auto result = measured_json({"resistance", file, "--temperature", "23±1degC", "--voltage-gain", "1±0.05%",
                                     "--current-gain", "1±0.1%"});
  EXPECT_EQ(result.at("test"), "resistance");
  EXPECT_TRUE(covers(result, "R_dc", truth.at("R_dc")));
  EXPECT_TRUE(covers(result, "R_dc_20", truth.at("R_dc_20")));
  EXPECT_NEAR(result.at("model").at("parameters").at("thermal_offset").at("value").get<double>(), 9e-6, 3e-6);
}

// A table as people type it: no time, a column that counts, millivolts.
TEST(Resistance, NeedsNoTime) {
  const TemporaryFolder folder;
  const std::string file = folder.file("typed.csv",
                                       "reading,V [mV],I [A]\n1,352.11,1.0002\n2,-352.08,-1.0001\n3,352.15,1.0003\n"
                                       "4,-352.06,-1.0001\n5,352.12,1.0002\n6,-352.10,-1.0002\n");
  const auto result = measured_json({"resistance", file});
  EXPECT_NEAR(result.at("quantities").at("R_dc").at("value").get<double>(), 0.35204, 2e-5);
  EXPECT_FALSE(result.at("quantities").contains("R_dc_20"));
  EXPECT_THAT(codes_of(result), Contains("temperature_unknown"));
}

TEST(Resistance, OfOnePolarityGivesTheValueAndSaysThatTheOffsetIsIn) {
  const TemporaryFolder folder;
  const std::string file = folder / "one.csv";
  const auto truth = simulate_readings(file, {"--one-polarity", "--noise", "2uV", "--thermal-offset", "8uV"}).at("truth");
  const auto result = measured_json({"resistance", file});
  EXPECT_TRUE(covers(result, "R_dc", truth.at("R_dc")));
  EXPECT_THAT(codes_of(result), Contains("thermal_offset"));
}

TEST(Resistance, TakesOneCaptureForEachPolarity) {
  const TemporaryFolder folder;
  const std::string forward = folder.file("forward.csv", "CH1 [V],CH2 [V]\n0.3530,0.1001\n0.3532,0.1002\n0.3531,0.1001\n");
  const std::string reverse = folder.file("reverse.csv", "CH1 [V],CH2 [V]\n-0.3510,-0.1001\n-0.3508,-0.1000\n-0.3509,-0.1001\n");
  const auto result = measured_json({"resistance", forward, reverse, "--shunt", "0.1ohm±0.5%"});
  EXPECT_EQ(result.at("sources").size(), 2u);
  EXPECT_NEAR(result.at("quantities").at("R_dc").at("value").get<double>(), 0.352 / 1.001, 2e-4);
  EXPECT_NEAR(result.at("model").at("parameters").at("thermal_offset").at("value").get<double>(), 1.1e-3, 3e-4);
}

TEST(Resistance, GivesTheTemperatureOfAHotWindingWithEitherConstant) {
  const TemporaryFolder folder;
  const std::string file = folder.file("hot.csv", "V [V],I [A]\n11.965,1\n-11.965,-1\n11.965,1\n-11.965,-1\n");
  const std::vector<std::string> line = {"resistance", file, "--exact-bench", "--cold", "10ohm±0%", "--cold-temperature", "20±0.01degC",
                                         "--temperature", "20±0.01degC"};
  const auto rise = [&](std::vector<std::string> arguments, const std::vector<std::string>& more) {
    arguments.insert(arguments.end(), more.begin(), more.end());
    return measured_json(arguments).at("quantities").at("T_rise").at("value").get<double>();
  };
  EXPECT_NEAR(rise(line, {}), 50.00925, 1e-5);
  EXPECT_NEAR(rise(line, {"--rise-constant", "235"}), 50.10750, 1e-5);
  EXPECT_NEAR(rise(line, {"--material", "aluminium"}), 0.1965 * 245, 1e-5);
}

TEST(Resistance, NoticesWarming) {
  const TemporaryFolder folder;
  const std::string file = folder / "warm.csv";
  const auto truth = simulate_readings(file, {"--noise", "5uV", "--thermal-resistance", "40", "--current", "2A"}).at("truth");
  const auto result = measured_json({"resistance", file});
  EXPECT_THAT(codes_of(result), Contains("warming"));
  EXPECT_TRUE(covers(result, "R_dc", truth.at("R_dc")));
}

TEST(Resistance, DrawsAFigureAndWritesAPage) {
  const TemporaryFolder folder;
  const std::string file = folder / "readings.csv", figure = folder / "r.svg", page = folder / "r.html";
  simulate_readings(file, kMeters);
  const ProgramEnd end = run_program_process({"resistance", file, "--figure", figure, "--report", page});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("R_dc"));
  EXPECT_THAT(contents_of(figure), HasSubstr("<svg"));
  EXPECT_THAT(contents_of(page), HasSubstr("winding resistance"));
}

TEST(Resistance, RefusesInWordsWhatItCannotUse) {
  const TemporaryFolder folder;
  const auto refused = [&](const std::string& table, const std::vector<std::string>& more, int exit_code) {
    std::vector<std::string> arguments = {"resistance", folder.file("bad.csv", table)};
    arguments.insert(arguments.end(), more.begin(), more.end());
    return measured_json(arguments, exit_code);
  };
  const std::string good = "V [V],I [A]\n0.5,1\n-0.5,-1\n0.501,1\n-0.5,-1\n";
  EXPECT_EQ(refused("V [V]\n0.5\n-0.5\n0.5\n", {}, 2).at("problem"), "missing_column");
  EXPECT_EQ(refused(good, {"--current", "X"}, 2).at("problem"), "missing_column");
  EXPECT_EQ(refused("V [ohm],I [A]\n0.5,1\n-0.5,-1\n0.5,1\n", {"--voltage", "V"}, 2).at("problem"), "usage");
  EXPECT_EQ(refused(good, {"--current", "I", "--shunt", "0.1ohm"}, 2).at("problem"), "usage");
  EXPECT_EQ(refused(good, {"--temperature", "23ohm"}, 2).at("problem"), "wrong_unit");
  EXPECT_EQ(refused(good, {"--cold", "0.4ohm"}, 2).at("problem"), "usage");
  EXPECT_EQ(refused(good, {"--cold-temperature", "20degC"}, 2).at("problem"), "usage");
  EXPECT_EQ(refused(good, {"--rise-constant", "235"}, 2).at("problem"), "usage");
  EXPECT_EQ(refused(good, {"--material", "copper", "--temperature-coefficient", "0.004"}, 2).at("problem"), "usage");
  EXPECT_THAT(codes_of(refused("V [V],I [A]\n1e-5,0\n2e-5,0\n1e-5,0\n", {}, 3)), Contains("no_current"));
  EXPECT_EQ(refused("V [V],I [A]\n0.5,1\n", {}, 2).at("problem"), "too_few_samples");
  EXPECT_THAT(codes_of(refused("V [V],I [A]\n0.5,1\nnan,-1\n0.5,nan\nnan,nan\n", {}, 3)), Contains("too_few_samples"));
  EXPECT_THAT(codes_of(refused("V [V],I [A]\n-0.5,1\n0.5,-1\n-0.501,1\n0.5,-1\n", {}, 3)), Contains("negative_resistance"));
}

}  // namespace
}  // namespace coilassay::test

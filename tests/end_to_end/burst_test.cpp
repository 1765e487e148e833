// From a captured pulse, chirp or noise to the coil's circuit, through the program itself.
#include <gmock/gmock.h>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

nlohmann::json simulate_burst(const std::string& file, const std::vector<std::string>& parameters) {
  std::vector<std::string> arguments = {"simulate", "burst", "-o", file, "--truth", file + ".json"};
  arguments.insert(arguments.end(), parameters.begin(), parameters.end());
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, 0) << end.error;
  const std::string truth = contents_of(file + ".json");
  EXPECT_EQ(schema_trouble(truth, "truth"), "");
  return nlohmann::json::parse(truth).at("truth");
}

std::string code_of(const nlohmann::json& result, const std::string& severity) {
  for (const auto& finding : result.at("findings")) {
    if (finding.at("severity") == severity) return finding.at("code");
  }
  return "";
}

bool has(const nlohmann::json& result, const std::string& code) {
  for (const auto& finding : result.at("findings")) {
    if (finding.at("code") == code) return true;
  }
  return false;
}

TEST(Burst, EveryKindGivesTheCircuitWithIntervalsThatHoldTheTruth) {
  const TemporaryFolder folder;
  for (const std::string kind : {"pulse", "chirp", "noise"}) {
    const std::string file = folder / (kind + ".csv");
    const auto truth = simulate_burst(file, {"--burst", kind, "--shunt", "1ohm", "--shunt-inductance", "3nH", "--skew", "4ns", "--noise", "2mV",
                                             "--current-noise", "10uA", "--bits", "12", "--parallel-resistance", "20k", "--highest", "8MHz",
                                             "--samples", kind == "noise" ? "100000" : "20000"});
    const auto result = measured_json({"sweep", file, "--from-waveform", "--shunt", "1ohm±1%", "--shunt-inductance", "3nH±2nH", "--skew",
                                       "4ns±1ns", "--voltage-gain", "1±1%", "--at", "2MHz"});   // noise says nothing below 1 MHz here
    EXPECT_TRUE(covers(result, "L", truth.at("L"))) << kind;
    EXPECT_TRUE(covers(result, "C_par", truth.at("C_par"))) << kind;
    EXPECT_TRUE(has(result, "excitation_band"));
    EXPECT_EQ(code_of(result, "caution"), "") << kind;
    EXPECT_EQ(code_of(result, "refusal"), "") << kind;
  }
}

TEST(Burst, SeveralCapturesOfOneBurstAreAddedUp) {
  const TemporaryFolder folder;
  std::vector<std::string> arguments = {"sweep"};
  nlohmann::json truth;
  for (const char* seed : {"1", "2", "3"}) {
    const std::string file = folder / (std::string(seed) + ".csv");
    truth = simulate_burst(file, {"--noise", "5mV", "--current-noise", "20uA", "--seed", seed});
    arguments.push_back(file);
  }
  arguments.insert(arguments.end(), {"--from-waveform", "--exact-bench"});
  const auto result = measured_json(arguments);
  EXPECT_TRUE(covers(result, "L", truth.at("L")));
  EXPECT_EQ(result.at("sources").size(), 3u);
}

TEST(Burst, AChirpThatIsCutIsAResultWithoutAValue) {
  const TemporaryFolder folder;
  const std::string file = folder / "cut.csv";
  simulate_burst(file, {"--burst", "chirp", "--filled", "1", "--samples", "50000"});
  const auto result = measured_json({"sweep", file, "--from-waveform"}, 3);
  EXPECT_EQ(code_of(result, "refusal"), "burst_cut");
  EXPECT_FALSE(result.at("quantities").contains("L"));
}

TEST(Burst, WithoutTheOptionTheWaveformIsNamedAndTheOptionTold) {
  const TemporaryFolder folder;
  const std::string file = folder / "pulse.csv";
  simulate_burst(file, {});
  const ProgramEnd end = run_program_process({"sweep", file});
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_THAT(end.error, HasSubstr("--from-waveform"));
}

}  // namespace
}  // namespace coilassay::test

// One simulated coil measured in every way the program knows: after conversion to L, R and C_par the answers must agree within
// their intervals. The simulators share no code with the fits, and each method its own with no other.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <map>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using nlohmann::json;

// 47 uH, 0.35 ohm, 20 pF: a coil whose own capacitance is seen by some of the methods and not by others.
constexpr double kL = 47e-6, kR = 0.35, kC = 20e-12;
const std::vector<std::string> kCoil{"--inductance", "47uH", "--resistance", "0.35ohm", "--parallel-capacitance", "20pF"};

void simulate(const std::string& kind, const std::string& file, std::vector<std::string> more, bool capacitance = true) {
  std::vector<std::string> arguments{"simulate", kind, "-o", file};
  arguments.insert(arguments.end(), kCoil.begin(), capacitance ? kCoil.end() : kCoil.end() - 2);
  arguments.insert(arguments.end(), more.begin(), more.end());
  const ProgramEnd end = run_program_process(arguments);
  ASSERT_EQ(end.exit_code, 0) << end.error;
}

TEST(Agreement, EveryMethodFindsTheSameInductance) {
  const TemporaryFolder folder;
  std::map<std::string, std::pair<double, double>> found;   // L and the half-width of its interval
  const auto take = [&](const std::string& method, const json& quantity, double factor = 1) {
    found[method] = {quantity.at("value").get<double>() * factor, quantity.at("U").get<double>() * factor};
  };

  std::vector<std::string> line{"ringdown"};
  for (const char* c : {"1nF", "4.7nF", "22nF"}) {
    const std::string file = folder / (std::string("ring-") + c + ".csv");
    simulate("ringdown", file, {"--capacitor", c, "--noise", "1mV", "--bits", "12", "--seed", "3"});
    line.push_back(file);
  }
  for (const char* c : {"1nF±1%", "4.7nF±1%", "22nF±1%"}) line.insert(line.end(), {"--capacitor", c});
  line.insert(line.end(), {"--probe-capacitance", "13pF±1pF", "--probe-resistance", "10Mohm±1%"});
  const json ring = measured_json(line);
  take("ring-down", ring.at("quantities").at("L"));
  EXPECT_TRUE(covers(ring, "C_par", kC));

  const std::string sine = folder / "sine.csv";
  simulate("sine", sine, {"--frequency", "200kHz", "--noise", "1mV", "--current-noise", "20uA", "--bits", "12"});
  const json driven = measured_json({"sine", sine, "--voltage-gain", "1±1%", "--current-gain", "1±1%", "--skew", "0ns±0.5ns"});
  const double x = 2 * M_PI * 200e3 * std::sqrt(kL * kC);
  take("sine", driven.at("quantities").at("L_s"), 1 - x * x);   // the coil's own capacitance taken out

  const std::string sweep = folder / "sweep.csv";
  simulate("sweep", sweep, {"--noise", "0.1%"});
  const json swept = measured_json({"sweep", sweep});
  take("sweep", swept.at("quantities").at("L"));
  EXPECT_TRUE(covers(swept, "C_par", kC));
  EXPECT_TRUE(covers(swept, "R_dc", kR));

  const std::string ramp = folder / "ramp.csv";
  simulate("ramp", ramp, {"--core", "ferrite", "--knee-current", "20A", "--peak-current", "4A", "--noise", "20mV", "--current-noise", "5mA",
                          "--bits", "12"}, false);
  const json pulse = measured_json({"ramp", ramp, "--dcr", "0.35ohm±1%", "--voltage-gain", "1±1%", "--current-gain", "1±1%"});
  take("ramp", pulse.at("quantities").at("L_0"));

  ASSERT_EQ(found.size(), 4u);
  for (const auto& [method, value] : found) {
    EXPECT_NEAR(value.first, kL, value.second) << method;
    EXPECT_LT(value.second, 0.03 * kL) << method << " says too little to disagree";
    for (const auto& [other, its] : found) {
      EXPECT_LE(std::fabs(value.first - its.first), std::hypot(value.second, its.second)) << method << " and " << other;
    }
  }
}

// A resonance of Q 5600: its place is known as well as the analyser's frequency, however narrow it is.
TEST(Sweep, ANarrowResonanceIsAsWellKnownAsTheFrequencyIs) {
  const TemporaryFolder folder;
  const std::string file = folder / "sweep.csv";
  simulate("sweep", file, {"--noise", "0.1%", "--seed", "3"});
  const json result = measured_json({"sweep", file, "--timebase", "100ppm"});
  const double f_r = 1 / (2 * M_PI * std::sqrt(kL * kC));
  EXPECT_TRUE(covers(result, "f_r", f_r * std::sqrt(1 - kR * kR * kC / kL)));
  EXPECT_LT(result.at("quantities").at("f_r").at("U").get<double>(), 1.2e-4 * f_r);
}

// Edges sharper than the samples can follow fold back and bend the whole sweep: what it would say of the resonance to a
// millionth would be wrong.
TEST(Sweep, ABurstThatFoldsBackSaysNothingSharpOfTheResonance) {
  const TemporaryFolder folder;
  const std::string file = folder / "burst.csv";
  simulate("burst", file, {"--samples", "8000"});
  const json result = measured_json({"sweep", "--from-waveform", file});
  const double f_r = 1 / (2 * M_PI * std::sqrt(kL * kC));
  EXPECT_TRUE(covers(result, "L", kL));
  if (result.at("quantities").contains("f_r")) {
    EXPECT_TRUE(covers(result, "f_r", f_r));
  }
  for (const char* symbol : {"R_ac", "R_par"}) EXPECT_FALSE(result.at("bounds").contains(symbol)) << symbol;
}

TEST(Sweep, DigitsOfANoiselessFileAreNoBreachOfCausality) {
  const TemporaryFolder folder;
  for (const char* name : {"sweep.csv", "sweep.s1p"}) {
    const std::string file = folder / name;
    simulate("sweep", file, {"--seed", "5"});
    for (const json& finding : measured_json({"sweep", file}).at("findings")) EXPECT_NE(finding.at("code"), "not_causal") << name;
  }
}

}  // namespace
}  // namespace coilassay::test

// A sweep from file to circuit, through the program itself.
#include <gmock/gmock.h>

#include <cmath>
#include <fstream>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;
using nlohmann::json;

json simulate_sweep(const std::string& file, const std::vector<std::string>& parameters = {}) {
  std::vector<std::string> arguments = {"simulate", "sweep", "-o", file, "--truth", file + ".json"};
  arguments.insert(arguments.end(), parameters.begin(), parameters.end());
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, 0) << end.error;
  const std::string truth = contents_of(file + ".json");
  EXPECT_EQ(schema_trouble(truth, "truth"), "");
  return json::parse(truth).at("truth");
}

const std::vector<std::string> kCoil = {"--noise", "0.1%", "--skin-resistance", "0.3ohm", "--parallel-resistance", "20kohm"};

const json* point_of(const json& result, const std::string& from, double near_hz) {
  for (const json& each : result.at("points")) {
    if (each.at("from") == from && std::fabs(each.at("at_Hz").get<double>() / near_hz - 1) < 0.05) return &each;
  }
  return nullptr;
}

TEST(SweepCommand, GivesTheCircuitWithIntervalsThatHoldTheTruth) {
  const TemporaryFolder folder;
  const std::string file = folder / "coil.csv";
  auto parameters = kCoil;
  parameters.insert(parameters.end(), {"--scale", "1.0006", "--phase-error=-0.5mrad"});
  const json truth = simulate_sweep(file, parameters);
  const json result = measured_json({"sweep", file, "--accuracy", "0.1%", "--at", "100kHz", "--at", "2MHz"});
  for (const char* symbol : {"L", "R_dc", "C_par", "R_par", "f_r"}) {
    EXPECT_TRUE(covers(result, symbol, truth.at(symbol).get<double>()));
  }
  EXPECT_EQ(result.at("test"), "sweep");
  EXPECT_EQ(result.at("model").at("name"), "R L C, skin, parallel loss");
  EXPECT_TRUE(result.at("model").at("runner_up").is_string());
  for (const char* from : {"model", "data"}) {
    for (const double f : {1e5, 2e6}) {
      const json* point = point_of(result, from, f);
      ASSERT_NE(point, nullptr) << from << f;
      for (const char* symbol : {"Z", "phi", "L_s", "R_s", "L_p", "R_p", "Q", "D"}) EXPECT_TRUE(point->contains(symbol)) << symbol;
    }
  }
}

TEST(SweepCommand, ATouchstoneFileAndATableOfTheSameCoilAgree) {
  const TemporaryFolder folder;
  const json truth = simulate_sweep(folder / "coil.s1p", {"--scattering-noise", "0.0002", "--parallel-resistance", "20kohm"});
  const json result = measured_json({"sweep", folder / "coil.s1p", "--exact-bench"});
  for (const char* symbol : {"L", "C_par", "R_par", "f_r"}) EXPECT_TRUE(covers(result, symbol, truth.at(symbol).get<double>()));
}

TEST(SweepCommand, ReadsWellOnATerminalAndWritesFigureReportAndModels) {
  const TemporaryFolder folder;
  simulate_sweep(folder / "coil.csv", kCoil);
  const ProgramEnd end = run_program_process({"sweep", folder / "coil.csv", "--at", "2MHz", "--figure", folder / "coil.svg", "--report", folder / "coil.html",
                                              "--netlist", folder / "coil.cir", "--touchstone", folder / "model.s1p"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("self-resonance"));
  EXPECT_THAT(end.out, HasSubstr("0.40 of the self-resonance"));
  EXPECT_THAT(contents_of(folder / "coil.svg"), HasSubstr("<svg"));
  EXPECT_THAT(contents_of(folder / "coil.html"), HasSubstr("<svg"));
  EXPECT_THAT(contents_of(folder / "coil.cir"), HasSubstr(".subckt coil a b"));
  // The model goes in again as any sweep does, and gives the same circuit.
  const json first = measured_json({"sweep", folder / "coil.csv"}), again = measured_json({"sweep", folder / "model.s1p", "--exact-bench"});
  const auto l = [](const json& r) { return r.at("quantities").at("L").at("value").get<double>(); };
  EXPECT_NEAR(l(again) / l(first), 1, 1e-6);
}

TEST(SweepCommand, SaturationOfARampGoesIntoTheNetlist) {
  const TemporaryFolder folder;
  simulate_sweep(folder / "coil.csv", {"--noise", "0.1%", "--inductance", "47uH", "--parallel-capacitance", "20pF"});
  ASSERT_EQ(run_program_process({"simulate", "ramp", "-o", folder / "pulse.csv", "--shunt", "10mohm"}).exit_code, 0);
  const ProgramEnd ramp = run_program_process({"ramp", folder / "pulse.csv", "--shunt", "10mohm±1%", "--json"});
  ASSERT_EQ(ramp.exit_code, 0) << ramp.error;
  std::ofstream(folder / "ramp.json") << ramp.out;
  const ProgramEnd end = run_program_process(
      {"sweep", folder / "coil.csv", "--netlist", folder / "coil.cir", "--saturation", folder / "ramp.json"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(contents_of(folder / "coil.cir"), HasSubstr("I = pwl(v(psi)"));

  std::ofstream(folder / "other.json") << "{\"schema\":\"coilassay.result/1\",\"test\":\"sine\"}";
  const ProgramEnd refused = run_program_process(
      {"sweep", folder / "coil.csv", "--netlist", folder / "coil.cir", "--saturation", folder / "other.json"});
  EXPECT_EQ(refused.exit_code, 2);
  EXPECT_THAT(refused.error, HasSubstr("no JSON result of a ramp"));
  EXPECT_EQ(run_program_process({"sweep", folder / "coil.csv", "--saturation", folder / "ramp.json"}).exit_code, 2);
}

TEST(SweepCommand, ManySinesMakeASweep) {
  const TemporaryFolder folder;
  std::vector<std::string> arguments = {"sweep"};
  for (const char* f : {"1k", "3k", "10k", "30k", "100k", "300k", "1M"}) {
    const std::string file = folder / (std::string(f) + ".csv");
    const ProgramEnd made = run_program_process({"simulate", "sine", "-o", file, "--quiet", "--frequency", std::string(f) + "Hz", "--inductance", "100uH",
                                                 "--resistance", "0.5ohm", "--shunt", "1ohm", "--noise", "1mV", "--current-noise", "1mA", "--samples", "4000"});
    ASSERT_EQ(made.exit_code, 0) << made.error;
    arguments.push_back(file);
  }
  arguments.insert(arguments.end(), {"--shunt", "1ohm±1%"});
  const json result = measured_json(arguments);
  EXPECT_TRUE(covers(result, "L", 100e-6));
  EXPECT_TRUE(covers(result, "R_dc", 0.5));
  EXPECT_EQ(result.at("sources").size(), 7U);
}

struct BadSweep {
  const char* what;
  const char* contents;
  int exit_code;
  const char* says;
};

// A clear sentence for each, and the exit code of its kind.
TEST(SweepCommand, BadInputIsExplained) {
  const TemporaryFolder folder;
  const BadSweep cases[] = {
      {"three", "f [Hz],R [ohm],X [ohm]\n1000,1,1\n2000,1,2\n4000,1,4\n", 2, "3 usable points"},
      {"one", "f [Hz],R [ohm],X [ohm]\n1000,1,1\n1000,1,1\n1000,1,1\n1000,1,1\n1000,1,1\n1000,1,1\n", 2, "one frequency"},
      {"zero", "f [Hz],R [ohm],X [ohm]\n0,1,0\n-1,1,1\n-2,1,2\n-3,1,3\n-4,1,4\n-5,1,5\n", 2, "must be above zero"},
      {"open", "f [Hz],S11 re,S11 im\n1000,1,0\n2000,1,0\n3000,1,0\n4000,1,0\n5000,1,0\n6000,1,0\n", 2, ""},
      {"negative", "f [Hz],R [ohm],X [ohm]\n1000,-1,1\n2000,-1,2\n4000,-1,4\n8000,-1,8\n16000,-1,16\n32000,-1,32\n", 3, "resistance is negative"},
      {"capacitor", "f [Hz],R [ohm],X [ohm]\n1000,1,-64\n2000,1,-32\n4000,1,-16\n8000,1,-8\n16000,1,-4\n32000,1,-2\n", 3, "no inductance"},
  };
  for (const BadSweep& each : cases) {
    const std::string file = folder / (std::string(each.what) + ".csv");
    std::ofstream(file) << each.contents;
    const ProgramEnd end = run_program_process({"sweep", file});
    EXPECT_EQ(end.exit_code, each.exit_code) << each.what << end.out << end.error;
    std::string said = end.out + end.error;   // wrapped to the terminal's width
    for (std::size_t at; (at = said.find("\n           ")) != std::string::npos;) said.replace(at, 12, " ");
    EXPECT_THAT(said, HasSubstr(each.says)) << each.what;
  }
  std::ofstream(folder / "wave.csv") << "time [s],V [V],I [A]\n0,1,0\n1e-6,2,1\n2e-6,1,2\n3e-6,0,1\n";
  const ProgramEnd wave = run_program_process({"sweep", folder / "wave.csv"});
  EXPECT_EQ(wave.exit_code, 2);
  EXPECT_THAT(wave.error, HasSubstr("waveform over time"));
}

}  // namespace
}  // namespace coilassay::test

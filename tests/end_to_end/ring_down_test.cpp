// From a capture file to a result, through the program itself.
#include <gmock/gmock.h>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;
using testing::Not;

const std::vector<std::string> kNoise = {"--noise", "2mV", "--samples", "5000"};

TEST(RingDown, GivesLRAndQOfACoilWithIntervalsThatHoldTheTruth) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  const auto truth = simulate_into(ring, kNoise).at("truth");
  const auto result = measured_json({"ringdown", ring, "--capacitor", "10nF±1%", "--probe-capacitance", "13pF±2pF",
                                     "--probe-resistance", "10M±1%", "--timebase", "25ppm"});
  for (const char* symbol : {"L_s", "R_s", "f_0", "f_d", "alpha", "Q", "Q_coil"}) {
    EXPECT_TRUE(covers(result, symbol, truth.at(symbol).get<double>()));
  }
  EXPECT_EQ(result.at("test"), "ringdown");
  EXPECT_EQ(result.at("sources").at(0).at("samples"), 5000);
  // One percent rectangular: the interval of L is about ±0.95 %, and not much wider.
  EXPECT_NEAR(result.at("quantities").at("L_s").at("U").get<double>(), 0.0095 * 47e-6, 0.0005 * 47e-6);
}

TEST(RingDown, ReadsWellOnATerminal) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  simulate_into(ring, kNoise);
  const ProgramEnd end = run_program_process({"ringdown", ring, "--capacitor", "10nF±1%"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_EQ(end.error, "");
  EXPECT_THAT(end.out, HasSubstr("L_s"));
  EXPECT_THAT(end.out, HasSubstr("µH"));
  EXPECT_THAT(end.out, HasSubstr("capacitor"));
  EXPECT_THAT(end.out, Not(HasSubstr("\x1b")));
  ProgramStart ascii;
  ascii.arguments = {"ringdown", ring, "--capacitor", "10nF+-1%"};
  ascii.environment = {"LC_ALL=C"};
  const ProgramEnd plain = run_program_process(ascii);
  EXPECT_THAT(plain.out, HasSubstr("uH"));
  EXPECT_TRUE(
      std::all_of(plain.out.begin(), plain.out.end(), [](char c) { return static_cast<unsigned char>(c) < 0x80; }));
}

TEST(RingDown, WithoutACapacitorSaysWhichToTry) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  const auto truth = simulate_into(ring, kNoise).at("truth");
  const auto result = measured_json({"ringdown", ring});
  EXPECT_TRUE(covers(result, "f_0", truth.at("f_0").get<double>()));
  EXPECT_FALSE(result.at("quantities").contains("L_s"));
  const ProgramEnd end = run_program_process({"ringdown", ring});
  EXPECT_EQ(end.exit_code, 0);
  EXPECT_THAT(end.out, HasSubstr("--capacitor"));
  EXPECT_THAT(end.out, HasSubstr("µH with 10 nF"));
}

TEST(RingDown, OfSeveralCapacitorsGivesLAndTheCoilsOwnCapacitance) {
  const TemporaryFolder folder;
  std::vector<std::string> line = {"ringdown"}, capacitors;
  for (const char* c : {"220pF", "1nF", "4n7"}) {
    const std::string file = folder / (std::string(c) + ".csv");
    simulate_into(file, {"--capacitor", c, "--parallel-capacitance", "60pF", "--noise", "1mV", "--samples", "5000"});
    line.push_back(file);
    capacitors.insert(capacitors.end(), {"--capacitor", std::string(c) + "±0.5%"});
  }
  line.insert(line.end(), capacitors.begin(), capacitors.end());
  line.insert(line.end(), {"--probe-capacitance", "13pF±1pF", "--probe-resistance", "10M±1%"});
  const auto result = measured_json(line);
  EXPECT_TRUE(covers(result, "L", 47e-6));
  EXPECT_TRUE(covers(result, "C_par", 60e-12));
}

TEST(RingDown, TakesTheSetUpFromABenchSheetAndOptionsBeforeIt) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  simulate_into(ring, kNoise);
  const std::string sheet =
      folder.file("bench.toml",
                  "[voltage]\ninput_capacitance = \"13 pF ± 2 pF\"\ninput_resistance = \"10 Mohm\"\n"
                  "[[capacitor]]\nvalue = \"10 nF ± 1 %\"\n[timebase]\ntolerance = \"25 ppm\"\n");
  const auto by_sheet = measured_json({"ringdown", ring, "--bench", sheet});
  EXPECT_TRUE(covers(by_sheet, "L_s", 47e-6));
  const auto other = measured_json({"ringdown", ring, "--bench", sheet, "--capacitor", "20nF±1%"});
  const double l = by_sheet.at("quantities").at("L_s").at("value").get<double>();
  EXPECT_NEAR(other.at("quantities").at("L_s").at("value").get<double>() / l, (10 + 0.013) / (20 + 0.013), 1e-6);
}

TEST(RingDown, ReadsStandardInput) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  simulate_into(ring, kNoise);
  ProgramStart start;
  start.arguments = {"ringdown", "-", "--capacitor", "10nF±1%", "--json"};
  start.input = contents_of(ring);
  const ProgramEnd piped = run_program_process(start);
  EXPECT_EQ(piped.exit_code, 0) << piped.error;
  const auto result = nlohmann::json::parse(piped.out);
  const auto from_file = measured_json({"ringdown", ring, "--capacitor", "10nF±1%"});
  EXPECT_EQ(result.at("quantities"), from_file.at("quantities"));
  EXPECT_EQ(result.at("sources").at(0).at("sha256"), from_file.at("sources").at(0).at("sha256"));
}

TEST(RingDown, GivesTheSameBytesForAnyNumberOfThreads) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  simulate_into(ring, kNoise);
  const std::vector<std::string> line = {"ringdown", ring,       "--capacitor", "10nF±1%", "--propagate",
                                         "trials",   "--trials", "20000",       "--json",  "--threads"};
  std::string first;
  for (const char* threads : {"1", "2", "5"}) {
    std::vector<std::string> arguments = line;
    arguments.emplace_back(threads);
    const ProgramEnd end = run_program_process(arguments);
    EXPECT_EQ(end.exit_code, 0) << end.error;
    if (first.empty()) first = end.out;
    EXPECT_EQ(end.out, first) << threads;
  }
}

TEST(RingDown, DrawsAFigureAndWritesAPage) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv", figure = folder / "ring.svg", page = folder / "ring.html";
  simulate_into(ring, kNoise);
  const ProgramEnd end =
      run_program_process({"ringdown", ring, "--capacitor", "10nF±1%", "--figure", figure, "--report", page});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(contents_of(figure), HasSubstr("<svg"));
  const std::string html = contents_of(page);
  EXPECT_THAT(html, HasSubstr("<svg"));
  EXPECT_THAT(html, HasSubstr("Content-Security-Policy"));
  EXPECT_THAT(html, HasSubstr("ring.csv"));
}

TEST(RingDown, KeepsToTheStatedWindow) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  simulate_into(ring, kNoise);
  const auto result = measured_json({"ringdown", ring, "--from", "20us", "--to", "100us"});
  const auto& window = result.at("model").at("window_s");
  EXPECT_GE(window[0].get<double>(), 20e-6);
  EXPECT_LE(window[1].get<double>(), 100e-6);
}

TEST(RingDown, NeverWritesADocumentOverTheCapture) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.svg";   // an odd name, but a table all the same
  simulate_into(ring, kNoise);
  const std::string before = contents_of(ring);
  const ProgramEnd end = run_program_process({"ringdown", ring, "--figure", ring});
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_THAT(end.error, HasSubstr("would be lost"));
  EXPECT_EQ(contents_of(ring), before);
}

// L_s is defined with the capacitance a bench can state; what the winding adds stands in C_par.
TEST(Simulate, TruthOfOneCapacitorLeavesTheWindingsCapacitanceInside) {
  const TemporaryFolder folder;
  const auto truth = simulate_into(folder / "ring.csv", {"--inductance", "47uH", "--capacitor", "1nF",
                                                             "--parallel-capacitance", "50pF", "--probe-capacitance", "0pF"}).at("truth");
  EXPECT_NEAR(truth.at("L_s").get<double>(), 47e-6 * 1.05, 1e-9);
  EXPECT_EQ(truth.at("L").get<double>(), 47e-6);
  const auto damped = simulate_into(folder / "damped.csv", {"--resistance", "200ohm"}).at("truth");
  EXPECT_TRUE(damped.at("f_d").is_null());
}

TEST(Simulate, WritesACaptureToStandardOutput) {
  const ProgramEnd end = run_program_process({"simulate", "ringdown", "-o", "-", "--samples", "100"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("time [s]"));
  EXPECT_EQ(end.error, "");
}

}  // namespace
}  // namespace coilassay::test

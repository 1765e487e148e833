// Open, short and load into a set, and the set taken out of a sweep, through the program itself.
#include <gmock/gmock.h>

#include <cmath>
#include <complex>
#include <fstream>
#include <functional>
#include <numbers>

#include "base/random.h"
#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;
using Complex = std::complex<double>;

constexpr double kLead_h = 18e-9, kLead_ohm = 0.03, kStray_f = 1.2e-12;

/// What is measured with this admittance in a fixture of leads and strays; 51 points a decade, noise of 0.02 %.
void write_sweep(const std::string& file, double from_hz, double to_hz, std::uint64_t seed, const std::function<Complex(double)>& of) {
  std::ofstream out(file);
  out.precision(15);
  out << "frequency [Hz],Re(Z) [ohm],Im(Z) [ohm]\n";
  Random random(seed);
  for (double f = from_hz; f < to_hz * 1.0001; f *= std::pow(10, 1.0 / 51)) {
    const double w = 2 * std::numbers::pi * f;
    const Complex z = (Complex(kLead_ohm, w * kLead_h) + 1.0 / (Complex(0, w * kStray_f) + of(w))) *
                      (1.0 + 2e-4 * Complex(random.normal(), random.normal()));
    out << f << "," << z.real() << "," << z.imag() << "\n";
  }
}

class FixtureBench : public testing::Test {
 protected:
  void SetUp() override {
    write_sweep(path("open.csv"), 1e3, 30e6, 1, [](double) { return Complex(0); });
    write_sweep(path("short.csv"), 1e3, 30e6, 2, [](double w) { return 1.0 / Complex(1e-3, w * 0.4e-9); });
    write_sweep(path("load.csv"), 1e3, 30e6, 3, [](double w) { return 1.0 / Complex(100, w * 0.5e-9); });
    write_sweep(path("part.csv"), 2e3, 20e6, 4, [](double w) { return 1.0 / Complex(0.2, w * 2.2e-6) + Complex(0, w * 8e-12); });
  }
  std::string path(const std::string& name) const { return folder_ / name; }
  ProgramEnd make(const std::vector<std::string>& more) const {
    std::vector<std::string> arguments = {"fixture", "tweezers", "-o", path("set.toml")};
    arguments.insert(arguments.end(), more.begin(), more.end());
    return run_program_process(arguments);
  }
  std::vector<std::string> open_and_short() const { return {"--open", path("open.csv"), "--short", path("short.csv")}; }
  ProgramEnd made(const std::vector<std::string>& more) const {
    std::vector<std::string> arguments = open_and_short();
    arguments.insert(arguments.end(), more.begin(), more.end());
    return make(arguments);
  }
  TemporaryFolder folder_;
};

TEST_F(FixtureBench, ASetTakesTheFixtureOutAndIsNamedInTheResult) {
  for (const bool with_load : {false, true}) {
    std::vector<std::string> more = {"--short-inductance", "0.4nH±0.1nH", "--short-resistance", "1mohm±1mohm", "--valid-for", "90d", "--part", "2.2uH", "--json"};
    if (with_load) more.insert(more.end(), {"--load", path("load.csv"), "--load-standard", "100ohm±0.1%", "--load-inductance", "0.5nH±0.5nH"});
    const ProgramEnd end = made(more);
    ASSERT_EQ(end.exit_code, 0) << end.error;
    EXPECT_EQ(schema_trouble(end.out, "fixture"), "") << end.out;
    const auto document = nlohmann::json::parse(end.out);
    EXPECT_NEAR(document.at("effects").at(3).at("series_H").get<double>(), 18e-9, 2e-10);

    const auto without = measured_json({"sweep", path("part.csv"), "--accuracy", "0.05%"});
    EXPECT_FALSE(covers(without, "L", 2.2e-6));
    const auto result = measured_json({"sweep", path("part.csv"), "--accuracy", "0.05%", "--fixture", path("set.toml")});
    EXPECT_TRUE(covers(result, "L", 2.2e-6));
    EXPECT_TRUE(covers(result, "R_dc", 0.2));
    EXPECT_TRUE(covers(result, "C_par", 8e-12));
    EXPECT_THAT(result.at("corrections").dump(), HasSubstr("tweezers"));
    bool in_budget = false;
    for (const auto& line : result.at("budget").at("L")) in_budget = in_budget || line.at("source") == "short inductance";
    EXPECT_TRUE(in_budget);

    // The same from the bench sheet.
    std::ofstream(path("bench.toml")) << "[impedance]\naccuracy = \"0.05 %\"\n[fixture]\nset = \"set.toml\"\n";
    const auto by_sheet = measured_json({"sweep", path("part.csv"), "--bench", path("bench.toml")});
    EXPECT_EQ(by_sheet.at("quantities").at("L").at("value"), result.at("quantities").at("L").at("value"));
    std::filesystem::remove(path("set.toml"));
  }
}

TEST_F(FixtureBench, WhatCannotBeASetIsRefusedInASentence) {
  EXPECT_THAT(made({}).error, HasSubstr("no default"));
  EXPECT_THAT(make({"--open", path("short.csv"), "--short", path("open.csv"), "--short-inductance", "0"}).error, HasSubstr("exchanged"));
  EXPECT_THAT(make({"--open", path("short.csv"), "--short", path("short.csv"), "--short-inductance", "0"}).error, HasSubstr("hardly more than the short"));
  EXPECT_THAT(made({"--short-inductance", "0", "--load", path("load.csv")}).error, HasSubstr("--load-standard"));
  EXPECT_THAT(made({"--short-inductance", "0", "--expires", "2001-01-01"}).error, HasSubstr("past already"));
  EXPECT_THAT(made({"--short-inductance", "0", "--expires", "soon"}).error, HasSubstr("no date"));
  const ProgramEnd nameless = run_program_process({"fixture", "", "--open", path("open.csv"), "--short", path("short.csv"), "--short-inductance", "0"});
  EXPECT_EQ(nameless.exit_code, 2);
  EXPECT_THAT(nameless.error, HasSubstr("the set has no name"));
  EXPECT_FALSE(std::filesystem::exists(path("set.toml")));
  EXPECT_EQ(made({"--short-inductance", "0"}).exit_code, 0);
  const ProgramEnd again = made({"--short-inductance", "0"});
  EXPECT_EQ(again.exit_code, 2);
  EXPECT_THAT(again.error, HasSubstr("never edited"));
}

TEST_F(FixtureBench, AGridThatDoesNotCoverTheSweepIsRefusedAndAnExpiredSetIsSaid) {
  ASSERT_EQ(made({"--short-inductance", "0.4nH±0.1nH"}).exit_code, 0);
  write_sweep(path("wide.csv"), 100, 1e6, 4, [](double w) { return 1.0 / Complex(0.2, w * 2.2e-6); });
  const ProgramEnd wide = run_program_process({"sweep", path("wide.csv"), "--fixture", path("set.toml")});
  EXPECT_EQ(wide.exit_code, 2);
  EXPECT_THAT(wide.error, HasSubstr("and the sweep goes from 100"));

  std::string set = contents_of(path("set.toml"));
  set.replace(set.find("made = "), 17, "made = 2001-01-01\nexpires = 2001-03-01");
  std::ofstream(path("old.toml")) << set;
  const auto result = measured_json({"sweep", path("part.csv"), "--fixture", path("old.toml")});
  EXPECT_THAT(result.at("findings").dump(), HasSubstr("fixture_expired"));
  EXPECT_TRUE(result.at("quantities").contains("L"));

  std::ofstream(path("damaged.toml")) << contents_of(path("set.toml")) << "\n[note]\ntext = \"x\"\n";
  const ProgramEnd damaged = run_program_process({"sweep", path("part.csv"), "--fixture", path("damaged.toml")});
  EXPECT_EQ(damaged.exit_code, 2);
  EXPECT_THAT(damaged.error, HasSubstr("note"));
}

TEST_F(FixtureBench, OtherTestsSayThatTheyDoWithoutTheSet) {
  ASSERT_EQ(made({"--short-inductance", "0"}).exit_code, 0);
  std::ofstream(path("bench.toml")) << "[fixture]\nset = \"set.toml\"\n";
  ASSERT_EQ(run_program_process({"simulate", "sine", "-o", path("sine.csv"), "--noise", "1mV", "--current-noise", "10uA"}).exit_code, 0);
  const ProgramEnd end = run_program_process({"sine", path("sine.csv"), "--bench", path("bench.toml")});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("fixture set"));
}

TEST_F(FixtureBench, PortsPlanesAndAdaptersAreSaidOrRefused) {
  // 10 uH and 1 ohm from port to port, 50 ohm: S21 = 100/(100 + Z).
  std::ofstream out(path("through.s2p"));
  out.precision(12);
  out << "# Hz S RI R 50\n";
  for (double f = 10e3; f < 10e6; f *= 1.1) {
    const Complex z(1, 2 * std::numbers::pi * f * 10e-6), s11 = z / (z + 100.0), s21 = 100.0 / (z + 100.0);
    out << f << " " << s11.real() << " " << s11.imag() << " " << s21.real() << " " << s21.imag() << " " << s21.real() << " " << s21.imag() << " "
        << s11.real() << " " << s11.imag() << "\n";
  }
  out.close();
  const auto result = measured_json({"sweep", path("through.s2p"), "--connection", "series"});
  EXPECT_TRUE(covers(result, "L", 10e-6));
  const auto trouble = [&](std::vector<std::string> arguments) {
    arguments.insert(arguments.begin(), {"sweep", path("through.s2p")});
    const ProgramEnd end = run_program_process(arguments);
    EXPECT_EQ(end.exit_code, 2) << end.out;
    return end.error;
  };
  EXPECT_THAT(trouble({"--connection", "series", "--reference-plane", "12mm"}), HasSubstr("--remove-port1"));
  EXPECT_THAT(trouble({"--port", "1", "--remove-port2", path("through.s2p")}), HasSubstr("another port"));
  EXPECT_THAT(trouble({"--velocity-factor", "0.7"}), HasSubstr("--reference-plane"));
  EXPECT_THAT(trouble({"--port", "3"}), HasSubstr("no port 3"));
}

}  // namespace
}  // namespace coilassay::test

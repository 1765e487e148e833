// A gauge study from captures and from a table, through the program itself.
#include <gmock/gmock.h>

#include <cmath>
#include <map>
#include <string>

#include "base/random.h"
#include "tests/end_to_end/bench.h"
#include "tests/support/paths.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

nlohmann::json gauge_json(std::vector<std::string> arguments, int exit_code = 0) {
  arguments.insert(arguments.begin(), "gauge");
  arguments.push_back("--json");
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, exit_code) << end.out << end.error;
  EXPECT_EQ(schema_trouble(end.out, exit_code == 2 ? "error" : "gauge"), "") << end.out;
  return nlohmann::json::parse(end.out, nullptr, false);
}

double sigma(const nlohmann::json& study, const std::string& name) {
  for (const auto& component : study.at("components")) {
    if (component.at("name") == name) return component.at("sigma");
  }
  return NAN;
}

/// Five parts, two operators, three trials; the deviations are planted in the coils themselves.
struct Planted {
  std::string folder;
  std::map<std::string, double> henry;   // by "part.operator.trial"
};
Planted plant(const TemporaryFolder& folder) {
  Planted planted{folder.path(), {}};
  Random random(3, 9);
  for (int part = 1; part <= 5; ++part) {
    const double of_part = 1e-6 * random.normal();
    for (const auto& [name, of_operator] : {std::pair{"ada", 0.1e-6}, {"bo", -0.1e-6}}) {
      for (int trial = 1; trial <= 3; ++trial) {
        const double henry = 47e-6 + of_part + of_operator + 0.08e-6 * random.normal();
        const std::string cell = std::to_string(part) + "." + name + "." + std::to_string(trial);
        planted.henry[cell] = henry;
        simulate_into(folder / (cell + ".ringdown.csv"),
                      {"--inductance", std::to_string(henry * 1e6) + "uH", "--samples", "2000", "--noise", "0.5mV", "--probe-capacitance", "0pF"});
      }
    }
  }
  return planted;
}

TEST(Gauge, OfCapturesFindsWhatWasPlanted) {
  const TemporaryFolder folder;
  const Planted planted = plant(folder);
  const std::string sheet = folder.file("part.toml",
                                        "[part]\nname = \"drum\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"42 uH\"\nmax = \"52 uH\"\n"
                                        "[test.ringdown]\ncapacitor = \"10 nF ± 1 %\"\nprobe_capacitance = \"0 pF ± 0 %\"\n");
  const auto study = gauge_json({planted.folder, "--part-sheet", sheet});
  EXPECT_EQ(study.at("quantity"), "L_s");
  EXPECT_EQ(study.at("parts").size(), 5u);
  EXPECT_EQ(study.at("sources").size(), 30u);
  EXPECT_DOUBLE_EQ(study.at("tolerance"), 10e-6);
  // The readings are the planted coils within what 0.5 mV of noise does to them.
  for (const auto& r : study.at("readings")) {
    const std::string cell = r.at("part").get<std::string>() + "." + r.at("operator").get<std::string>() + "." + r.at("trial").get<std::string>();
    EXPECT_NEAR(r.at("value").get<double>(), planted.henry.at(cell), 0.02e-6) << cell;
  }
  EXPECT_NEAR(sigma(study, "repeatability"), 0.08e-6, 0.03e-6);   // 20 degrees of freedom
  EXPECT_NEAR(sigma(study, "operator"), 0.1e-6 * std::sqrt(2.0), 0.05e-6);
  EXPECT_THAT(study.at("sheet_lines").get<std::string>(), HasSubstr("[gauge]\nL_s = \""));
  // The sheet takes the lines as they are.
  const std::string with_gauge = folder.file("with.toml", contents_of(sheet) + study.at("sheet_lines").get<std::string>());
  EXPECT_EQ(gauge_json({planted.folder, "--part-sheet", with_gauge}).at("readings"), study.at("readings"));
  EXPECT_EQ(gauge_json({planted.folder, "--part-sheet", sheet, "--threads", "1"}), study);
}

TEST(Gauge, OfATableSpeaksLikeAPerson) {
  const std::string table = project_file("tests/published/data/gauge/gauge_rr_crossed.csv");
  const ProgramEnd end = run_program_process({"gauge", table, "--color", "never"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  for (const char* said : {"10 parts, 3 operators, 3 trials", "repeatability", "27.9 %", "The gauge is poor", "4 categories", "pooled"}) {
    EXPECT_THAT(end.out, HasSubstr(said));
  }
  const TemporaryFolder folder;
  const auto study = gauge_json({table, "--tolerance", "8", "--figure", folder / "study.svg"});
  EXPECT_NEAR(study.at("grr_of_tolerance").at("value").get<double>(), 6 * 0.302372 / 8, 1e-5);
  EXPECT_EQ(study.at("judgement"), "conditional");
  EXPECT_THAT(contents_of(folder / "study.svg"), HasSubstr("operator A"));
}

TEST(Gauge, IsRefusedWithTheReadingThatIsMissing) {
  const TemporaryFolder folder;
  const std::string table = folder.file("t.csv", "part,operator,trial,value\n1,A,1,1\n1,A,2,2\n2,A,1,3\n");
  const auto error = gauge_json({table}, 2);
  EXPECT_THAT(error.at("finding").get<std::string>(), HasSubstr("part 2, operator A, trial 2 is missing"));
  const TemporaryFolder captures;
  for (const char* name : {"1.a.1", "1.a.2", "2.a.1", "2.a.2"}) {
    simulate_into(captures / (std::string(name) + ".ringdown.csv"), {"--samples", "2000", "--noise", "1mV"});
  }
  captures.file("2.a.2.ringdown.csv", "t,V\n0,1\n");
  const auto bad = gauge_json({captures.path(), "--quantity", "f_0"}, 2);
  EXPECT_THAT(bad.at("place").get<std::string>(), HasSubstr("2.a.2.ringdown.csv"));
  EXPECT_THAT(gauge_json({captures.path(), "--quantity", "L_x"}, 2).at("finding").get<std::string>(), HasSubstr("no quantity"));
  EXPECT_THAT(gauge_json({captures.path(), "--quantity", "k"}, 2).at("finding").get<std::string>(), HasSubstr("gives k"));
}

}  // namespace
}  // namespace coilassay::test

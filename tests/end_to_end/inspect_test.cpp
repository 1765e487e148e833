// A lot from captures to a decision, through the program itself.
#include <gmock/gmock.h>

#include <filesystem>

#include "tests/end_to_end/bench.h"
#include "tests/end_to_end/lot_bench.h"

namespace coilassay::test {
namespace {

using testing::AllOf;
using testing::HasSubstr;
using testing::Not;

TEST(Inspect, AcceptsALotWhoseUnitsConform) {
  const LotBench bench;
  bench.good_units(4);
  const auto lot = bench.inspected();
  EXPECT_EQ(lot.at("decision"), "accept");
  EXPECT_EQ(lot.at("part"), "drum-47");
  EXPECT_EQ(lot.at("lot"), "lot") << "the folder's name";
  EXPECT_EQ(lot.at("lot_size"), 4);
  EXPECT_EQ(lot.at("ledger"), nullptr);
  for (int i = 1; i <= 4; ++i) {
    const auto unit = unit_of(lot, "0" + std::to_string(i));
    EXPECT_EQ(unit.at("verdict"), "pass");
    const auto& limit = unit.at("limits").at(0);
    const double truth = (45 + 0.1 * i) * 1e-6;
    EXPECT_LE(limit.at("interval").at(0).get<double>(), truth);
    EXPECT_GE(limit.at("interval").at(1).get<double>(), truth);
    EXPECT_LT(limit.at("u_own").get<double>(), 0.1 * limit.at("u").get<double>()) << "the capacitor is common to all";
  }
  const auto& values = lot.at("statistics").at(0);
  EXPECT_EQ(values.at("n"), 4);
  // Parts from 45.1 to 45.4 µH: a standard deviation of 0.129 µH, to which the capacitor adds nothing.
  EXPECT_NEAR(values.at("spread").get<double>(), 0.1291e-6, 2e-10);
  EXPECT_GT(values.at("u_common").get<double>(), 10 * values.at("u_own").get<double>());
}

TEST(Inspect, RejectsALotAndSaysWhichUnitWhyAndByHowMuch) {
  const LotBench bench;
  bench.good_units(3);
  bench.unit("04", 60);
  const ProgramEnd end = bench.inspect();
  EXPECT_EQ(end.exit_code, 1);
  EXPECT_EQ(end.out.find("Rejected"), 0u) << "the decision comes first";
  EXPECT_THAT(end.out, AllOf(HasSubstr("04  fails"), HasSubstr("60.00 µH"), HasSubstr("limits 37.6 µH to 56.4 µH"),
                             HasSubstr("under 0.1 %"), HasSubstr("Nothing was recorded")));
}

TEST(Inspect, AUnitAtAnotherFrequencyNeverPasses) {
  const LotBench bench;
  bench.good_units(2);
  // The same coil across another capacitor than the sheet says: it rings at 340 kHz, not at 230 kHz.
  bench.unit("03", 47, 3, {"--capacitor", "4.6nF"});
  const auto lot = bench.inspected({}, 1);
  const auto unit = unit_of(lot, "03");
  EXPECT_EQ(unit.at("verdict"), "not_comparable");
  EXPECT_THAT(unit.at("limits").at(0).at("why").get<std::string>(), HasSubstr("kHz"));
  EXPECT_EQ(lot.at("not_comparable"), 1);
}

TEST(Inspect, AUnitInsideTheGuardBandIsUndecided) {
  const LotBench bench("[sampling]\nundecided = \"set_aside\"\n");
  bench.good_units(2);
  bench.unit("03", 56.39);
  const auto lot = bench.inspected({}, 3);
  const auto unit = unit_of(lot, "03");
  EXPECT_EQ(unit.at("verdict"), "undecided");
  const double p = unit.at("limits").at(0).at("probability_conforming").get<double>();
  EXPECT_GT(p, 0.05);
  EXPECT_LT(p, 0.95);
}

TEST(Inspect, TheResultDoesNotDependOnThreads) {
  const LotBench bench;
  bench.good_units(6);
  auto one = bench.inspected({"--threads", "1"});
  auto four = bench.inspected({"--threads", "4"});
  one.erase("time");
  four.erase("time");
  EXPECT_EQ(one, four);
}

TEST(Inspect, DrawsTheSampleFromARecordedSeedAndMeasuresTheOthersToo) {
  const LotBench bench("[sampling]\nscheme = \"claim\"\nconfidence = \"50 %\"\nreliability = \"80 %\"\nseed = 7\n");
  bench.good_units(8);
  const auto lot = bench.inspected();
  const auto n = lot.at("plan").at("n").get<int>();
  EXPECT_EQ(lot.at("plan").at("draw_seed"), 7);
  EXPECT_LT(n, 8);
  int drawn = 0;
  for (const auto& unit : lot.at("units")) drawn += unit.at("in_sample").get<bool>() ? 1 : 0;
  EXPECT_EQ(drawn, n);
  EXPECT_EQ(lot.at("inspected"), n);
  EXPECT_EQ(lot.at("units").size(), 8u);
  EXPECT_EQ(bench.inspected().at("units"), lot.at("units")) << "the same units are drawn again";
}

TEST(Inspect, FollowGivesALineForEachUnitAndTheLotLast) {
  const LotBench bench;
  bench.good_units(3);
  const auto lines = bench.followed();
  ASSERT_EQ(lines.size(), 4u);
  EXPECT_EQ(lines[0].at("serial"), "01");
  EXPECT_EQ(lines[2].at("verdict"), "pass");
  EXPECT_EQ(lines[3].at("decision"), "accept");
}

TEST(Inspect, TakesRampAndRingdownOfOneUnitTogether) {
  const LotBench bench("[[limit]]\nquantity = \"I_sat_30\"\nmin = \"1.2 A\"\ntest = \"ramp\"\n");
  bench.good_units(1);
  ASSERT_EQ(run_program_process({"simulate", "ramp", "-o", bench.lot() + "/01.ramp.csv", "--quiet"}).exit_code, 0);
  const auto lot = bench.inspected();
  ASSERT_EQ(lot.at("units").at(0).at("limits").size(), 2u);
  EXPECT_EQ(lot.at("units").at(0).at("limits").at(1).at("test"), "ramp");
  EXPECT_EQ(lot.at("units").at(0).at("files").size(), 2u);
}

TEST(Inspect, JudgesCoupledWindingsFromAllCapturesOfThem) {
  const TemporaryFolder folder;
  ASSERT_EQ(run_program_process({"simulate", "coupled", "-o", folder / "pair", "--coupling", "0.97", "--noise", "0.1%", "--quiet"}).exit_code, 0);
  std::filesystem::create_directory(folder / "lot");
  for (const char* item : {"primary-open", "primary-short", "secondary-open"}) {
    std::filesystem::copy_file(folder / (std::string("pair-") + item + ".csv"), folder / (std::string("lot/T-1.coupling.") + item + ".csv"));
  }
  const std::string sheet = folder.file("pair.toml", "[part]\nname = \"pair\"\n[[limit]]\nquantity = \"k\"\nmin = \"0.9\"\n"
                                                     "test = \"coupling\"\nat = { frequency = \"20 kHz\" }\n[test.coupling]\n"
                                                     "link_inductance = \"10 nH ± 5 nH\"\n");
  const ProgramEnd end = run_program_process({"inspect", sheet, folder / "lot", "--json"});
  EXPECT_EQ(end.exit_code, 0) << end.out << end.error;
  const auto lot = nlohmann::json::parse(end.out, nullptr, false);
  ASSERT_TRUE(lot.is_object());
  const auto& limit = lot.at("units").at(0).at("limits").at(0);
  ASSERT_EQ(limit.at("verdict"), "pass") << limit;
  EXPECT_NEAR(limit.at("value").get<double>(), 0.97, 0.01);
  EXPECT_EQ(lot.at("units").at(0).at("files").size(), 3u);
}

TEST(InspectReport, IsOnePageWithTheDecisionFirstAndFigures) {
  const LotBench bench;
  bench.good_units(4);
  bench.unit("05", 60);
  const std::string page_file = bench.folder() / "lot.html";
  const ProgramEnd end = bench.inspect({"--ledger", bench.ledger(), "--operator", "<b>Ada</b>", "--lot",
                                        "04<script>12", "--report", page_file});
  EXPECT_EQ(end.exit_code, 1) << end.error;
  const std::string page = contents_of(page_file);
  EXPECT_THAT(page, AllOf(HasSubstr("Content-Security-Policy"), HasSubstr("Rejected"), HasSubstr("04&lt;script&gt;12-6"),
                          HasSubstr("&lt;b&gt;Ada&lt;/b&gt;"), HasSubstr("counter(pages)"), HasSubstr("Released by"),
                          HasSubstr("relates only to the units listed"), HasSubstr("SBW-114"), HasSubstr("2099-01-10"),
                          HasSubstr("23 °C ± 2 °C"), HasSubstr("guarded")));
  EXPECT_THAT(page, AllOf(Not(HasSubstr("<script")), Not(HasSubstr("<b>Ada")), Not(HasSubstr("href=\"http")),
                          Not(HasSubstr("src="))));
  std::size_t drawings = 0;
  for (std::size_t at = 0; (at = page.find("<svg", at)) != std::string::npos; ++at) ++drawings;
  EXPECT_EQ(drawings, 2u) << "the values, and the unit that fails";
  EXPECT_LT(page.find("Rejected"), page.find("How it was decided"));
}

TEST(InspectReport, CannotBeOfAnotherKind) {
  const LotBench bench;
  bench.good_units(1);
  EXPECT_EQ(bench.inspected({"--report", bench.folder() / "lot.odt"}, 2).at("place"), "--report");
}

TEST(CheckSheet, ExplainsASheetAndNamesContradictions) {
  const LotBench bench;
  const ProgramEnd good = run_program_process({"inspect", "--check-sheet", bench.sheet()});
  EXPECT_EQ(good.exit_code, 0) << good.error;
  EXPECT_THAT(good.out, AllOf(HasSubstr("37.6 µH to 56.4 µH"), HasSubstr("ringdown"), HasSubstr("guarded")));
  const ProgramEnd json = run_program_process({"inspect", "--check-sheet", bench.sheet(), "--json", "--lot-size", "500"});
  EXPECT_EQ(schema_trouble(json.out, "sheet-check"), "") << json.out;
  EXPECT_TRUE(nlohmann::json::parse(json.out).at("usable").get<bool>());
  const ProgramEnd folder = run_program_process({"inspect", "--check-sheet", bench.sheet(), bench.lot()});
  EXPECT_EQ(folder.exit_code, 2);
}

}  // namespace
}  // namespace coilassay::test

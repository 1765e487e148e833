// What a folder and a part sheet can get wrong: each once, each told in one sentence.
#include <gmock/gmock.h>

#include "tests/end_to_end/bench.h"
#include "tests/end_to_end/lot_bench.h"

namespace coilassay::test {
namespace {

using testing::AllOf;
using testing::HasSubstr;

/// The error document for a sheet in which one text is replaced by another.
nlohmann::json refused_sheet(const std::string& what, const std::string& by) {
  const LotBench bench;
  bench.good_units(1);
  std::string sheet = contents_of(bench.sheet());
  const std::size_t at = sheet.find(what);
  EXPECT_NE(at, std::string::npos) << what;
  sheet.replace(at, what.size(), by);
  bench.folder().file("drum.toml", sheet);
  const auto error = bench.inspected({}, 2);
  EXPECT_THAT(error.at("place").get<std::string>(), HasSubstr("drum.toml:")) << "the line is named";
  EXPECT_FALSE(error.at("remedy").get<std::string>().empty());
  return error;
}

TEST(InspectBadSheet, UnknownKey) {
  const auto error = refused_sheet("max = ", "maximum = ");
  EXPECT_THAT(error.at("finding").get<std::string>(), HasSubstr("maximum"));
}

TEST(InspectBadSheet, LimitInTheWrongUnit) {
  EXPECT_EQ(refused_sheet("56.4 uH", "56.4 ohm").at("problem"), "wrong_unit");
}

TEST(InspectBadSheet, MinAboveMax) {
  EXPECT_THAT(refused_sheet("37.6 uH", "57.6 uH").at("finding").get<std::string>(), HasSubstr("min"));
}

TEST(InspectBadSheet, QuantityThatDoesNotExist) {
  EXPECT_THAT(refused_sheet("\"L_s\"", "\"L_z\"").at("finding").get<std::string>(), HasSubstr("L_z"));
}

TEST(InspectBadSheet, QuantityItsTestCannotGive) {
  const LotBench bench;
  bench.good_units(1);
  std::string sheet = contents_of(bench.sheet());
  sheet.replace(sheet.find("\"L_s\""), 5, "\"f_r\"");
  sheet.replace(sheet.find("\"37.6 uH\""), 9, "\"1 MHz\"");
  sheet.replace(sheet.find("\"56.4 uH\""), 9, "\"2 MHz\"");
  bench.folder().file("drum.toml", sheet);
  const ProgramEnd check = run_program_process({"inspect", "--check-sheet", bench.sheet()});
  EXPECT_NE(check.exit_code, 0) << check.out;
  EXPECT_THAT(check.out + check.error, HasSubstr("f_r"));
  EXPECT_NE(bench.inspect().exit_code, 0) << "and nothing passes by it";
}

TEST(InspectBadSheet, BenchSheetThatIsNotThere) {
  const LotBench bench;
  bench.good_units(1);
  std::string sheet = contents_of(bench.sheet());
  sheet.replace(sheet.find("bench.toml"), 10, "gone.toml");
  bench.folder().file("drum.toml", sheet);
  EXPECT_THAT(bench.inspected({}, 2).at("place").get<std::string>(), HasSubstr("gone.toml"));
}

TEST(InspectBadLot, StraysAreNamedAndTheLotGoesOn) {
  const LotBench bench;
  bench.good_units(2);
  bench.folder().file("lot/03.rindgown.csv", "1,2\n");
  const auto lot = bench.inspected();
  const auto& finding = lot.at("findings").at(0);
  EXPECT_EQ(finding.at("code"), "stray_file");
  EXPECT_THAT(finding.at("message").get<std::string>(), AllOf(HasSubstr("03.rindgown.csv"), HasSubstr("ringdown?")));
}

TEST(InspectBadLot, OneCaptureUnderTwoSerialsJudgesNeither) {
  const LotBench bench;
  bench.good_units(1);
  bench.folder().file("lot/02.ringdown.csv", contents_of(bench.lot() + "/01.ringdown.csv"));
  const auto lot = bench.inspected({}, 1);
  EXPECT_NE(unit_of(lot, "01").at("verdict"), "pass");
  EXPECT_NE(unit_of(lot, "02").at("verdict"), "pass");
  EXPECT_THAT(unit_of(lot, "01").at("limits").at(0).at("why").get<std::string>(), HasSubstr("02.ringdown.csv"));
}

TEST(InspectBadLot, AUnitWithoutItsRampIsNotPassed) {
  const LotBench bench("[[limit]]\nquantity = \"I_sat_30\"\nmin = \"1.2 A\"\ntest = \"ramp\"\n[test.ramp]\n");
  bench.good_units(1);
  const auto unit = unit_of(bench.inspected({}, 1), "01");
  EXPECT_NE(unit.at("verdict"), "pass");
  EXPECT_EQ(unit.at("limits").at(0).at("verdict"), "pass") << "what was measured is judged";
  EXPECT_THAT(unit.at("limits").at(1).at("why").get<std::string>(), HasSubstr("ramp"));
}

TEST(InspectBadLot, AnUnreadableCaptureDoesNotStopTheOthers) {
  const LotBench bench;
  bench.good_units(1);
  bench.folder().file("lot/02.ringdown.csv", "no capture at all\n");
  const auto lot = bench.inspected({}, 1);
  EXPECT_EQ(unit_of(lot, "01").at("verdict"), "pass");
  EXPECT_NE(unit_of(lot, "02").at("verdict"), "pass");
  EXPECT_THAT(unit_of(lot, "02").at("limits").at(0).at("why").get<std::string>(), HasSubstr("02.ringdown.csv"));
}

TEST(InspectBadLot, FewerUnitsThanThePlanNeedsLeaveItUndecided) {
  const LotBench bench("[sampling]\nscheme = \"attributes\"\nlevel = \"II\"\naql = 1.0\n");
  bench.good_units(3);
  const auto lot = bench.inspected({"--lot-size", "500"}, 3);
  EXPECT_EQ(lot.at("decision"), "undecided");
  EXPECT_THAT(lot.at("why").get<std::string>(), HasSubstr("50"));
}

TEST(InspectBadLot, MoreUnitsThanTheLotHasIsAMistake) {
  const LotBench bench;
  bench.good_units(3);
  EXPECT_EQ(bench.inspected({"--lot-size", "2"}, 2).at("place"), "--lot-size");
}

TEST(InspectBadLot, AFolderThatIsNotThere) {
  const LotBench bench;
  const ProgramEnd end = run_program_process({"inspect", bench.sheet(), bench.folder() / "gone"});
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_THAT(end.error, HasSubstr("gone"));
}

TEST(InspectBadLot, TheFolderLeftOut) {
  const LotBench bench;
  const ProgramEnd end = run_program_process({"inspect", bench.sheet()});
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_THAT(end.error, HasSubstr("FOLDER"));
}

TEST(InspectBadLot, AReasonWithoutALedgerMeansNothing) {
  const LotBench bench;
  bench.good_units(1);
  EXPECT_EQ(bench.inspected({"--reason", "x"}, 2).at("place"), "--reason");
}

}  // namespace
}  // namespace coilassay::test

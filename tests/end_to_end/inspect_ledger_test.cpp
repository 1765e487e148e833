// What a ledger makes of an inspection: nothing twice, nothing lost, nothing without a reason.
#include <gmock/gmock.h>

#include <filesystem>

#include "tests/end_to_end/bench.h"
#include "tests/end_to_end/lot_bench.h"

namespace coilassay::test {
namespace {

using testing::AllOf;
using testing::HasSubstr;

void expect_holds(const LotBench& bench) {
  const ProgramEnd end = run_program_process({"ledger", "verify", bench.ledger()});
  EXPECT_EQ(end.exit_code, 0) << end.out << end.error;
}

std::vector<std::string> recorded(const LotBench& bench, std::vector<std::string> more = {}) {
  more.insert(more.begin(), {"--ledger", bench.ledger()});
  return more;
}

TEST(InspectLedger, RecordsEveryUnitAndTheDecisionOnce) {
  const LotBench bench;
  bench.good_units(3);
  const auto first = bench.inspected(recorded(bench));
  EXPECT_EQ(first.at("ledger").at("first"), 1);
  EXPECT_EQ(first.at("ledger").at("last"), 4);
  EXPECT_EQ(first.at("units").at(2).at("entry"), 3);
  const auto again = bench.inspected(recorded(bench));
  EXPECT_EQ(again.at("ledger"), first.at("ledger")) << "the same captures are the same attempts: nothing was added";
  EXPECT_TRUE(again.at("units").at(0).at("from_ledger").get<bool>());
  EXPECT_EQ(again.at("units").at(0).at("limits"), first.at("units").at(0).at("limits")) << "to the last digit";
  EXPECT_EQ(again.at("statistics"), first.at("statistics"));
  EXPECT_EQ(again.at("cautions"), first.at("cautions"));
  expect_holds(bench);
}

TEST(InspectLedger, UnitsThatComeLaterJoinTheLot) {
  const LotBench bench;
  bench.good_units(2);
  EXPECT_EQ(bench.inspected(recorded(bench)).at("ledger").at("last"), 3);
  bench.unit("03", 60);
  const auto lot = bench.inspected(recorded(bench), 1);
  EXPECT_EQ(lot.at("units").at(2).at("entry"), 4);
  EXPECT_EQ(lot.at("ledger").at("entry"), 5);
  EXPECT_EQ(lot.at("ledger").at("replaces"), 3);
}

TEST(InspectLedger, AnotherCaptureOfAUnitNeedsAReason) {
  const LotBench bench("[retest]\nattempts = 2\n");
  bench.good_units(1);
  bench.unit("02", 60, 5);
  bench.inspected(recorded(bench), 1);
  bench.unit("02", 47, 6);
  const auto refused = bench.inspected(recorded(bench), 2);
  EXPECT_THAT(refused.at("place").get<std::string>(), HasSubstr("02"));
  EXPECT_THAT(refused.at("finding").get<std::string>(), AllOf(HasSubstr("attempt 1, fail"), HasSubstr("reason")));

  const auto lot = bench.inspected(recorded(bench, {"--reason", "reseated in the fixture"}), 1);
  const auto unit = unit_of(lot, "02");
  EXPECT_EQ(unit.at("attempts_made"), 2);
  EXPECT_EQ(unit.at("verdict"), "fail") << "the first attempt that gives a result stands";
  const ProgramEnd shown = run_program_process({"ledger", "show", bench.ledger(), "--json", "4"});
  EXPECT_THAT(shown.out, HasSubstr("reseated in the fixture")) << shown.error;
}

TEST(InspectLedger, TheMeanOfTwoAttemptsMayStand) {
  const LotBench bench("[retest]\nattempts = 2\nuse = \"mean\"\n");
  bench.good_units(1);
  bench.unit("02", 50.0, 5);
  bench.inspected(recorded(bench));
  bench.unit("02", 50.2, 6);
  const auto lot = bench.inspected(recorded(bench, {"--reason", "reseated"}));
  const auto unit = unit_of(lot, "02");
  const auto& limit = unit.at("limits").at(0);
  EXPECT_NEAR(limit.at("value").get<double>(), 50.1e-6, 0.1e-6);
  // Two attempts that differ by 0.2 µH know their mean to 0.1 µH at best, far above what each claims for itself.
  EXPECT_GT(limit.at("u_own").get<double>(), 0.05e-6);
  EXPECT_THAT(limit.at("from").get<std::string>(), HasSubstr("mean of 2"));
}

TEST(InspectLedger, ACaptureOfAnotherUnitJudgesNobody) {
  const LotBench bench;
  bench.good_units(2);
  bench.inspected(recorded(bench));
  std::filesystem::copy_file(bench.lot() + "/01.ringdown.csv", bench.lot() + "/07.ringdown.csv");
  bench.remove("01");
  const auto lot = bench.inspected(recorded(bench), 1);
  const auto unit = unit_of(lot, "07");
  EXPECT_NE(unit.at("verdict"), "pass");
  EXPECT_THAT(unit.at("limits").at(0).at("why").get<std::string>(), HasSubstr("recorded for unit 01"));
}

TEST(InspectLedger, ALedgerOfAnotherPartIsRefused) {
  const LotBench bench;
  bench.good_units(1);
  bench.inspected(recorded(bench));
  std::string other = contents_of(bench.sheet());
  other.replace(other.find("drum-47"), 7, "drum-99");
  bench.folder().file("drum.toml", other);
  const auto refused = bench.inspected(recorded(bench), 4);
  EXPECT_EQ(refused.at("problem"), "ledger");
  EXPECT_THAT(refused.at("finding").get<std::string>(), HasSubstr("drum-47"));
}

TEST(InspectLedger, TwoRejectedLotsTightenTheThird) {
  const LotBench bench("[sampling]\nscheme = \"attributes\"\nlevel = \"II\"\naql = 6.5\n");
  for (const auto& [lot, decision, inductance] : {std::tuple{"A", 1, 60.0}, {"B", 1, 61.0}, {"C", 0, 47.0}}) {
    for (int i = 0; i < 3; ++i) {
      bench.unit(lot + std::to_string(i), inductance + i, static_cast<std::uint64_t>(i) + 10 * static_cast<std::uint64_t>(lot[0]));
    }
    const auto document = bench.inspected(recorded(bench, {"--lot", lot, "--lot-size", "3"}), decision);
    EXPECT_EQ(document.at("plan").at("severity"), lot[0] == 'C' ? "tightened" : "normal") << lot;
    EXPECT_EQ(document.at("next_severity"), lot[0] == 'A' ? "normal" : "tightened") << lot;
    for (int i = 0; i < 3; ++i) bench.remove(lot + std::to_string(i));
  }
}

TEST(InspectLedger, FollowsOnlyWhatIsStored) {
  const LotBench bench;
  bench.good_units(30);
  const auto lines = bench.followed(recorded(bench));
  ASSERT_EQ(lines.size(), 31u);
  for (std::size_t i = 0; i < 30; ++i) EXPECT_EQ(lines[i].at("entry"), i + 1);
  EXPECT_EQ(bench.followed(recorded(bench)).at(4).at("from_ledger"), true);
}

const std::string kCheck = "[check_standard]\nserial = \"CS-1\"\nquantity = \"L_s\"\nevery = \"8 h\"\n";

TEST(CheckStandard, WithoutOneMeasuredTheLotIsNotBegun) {
  const LotBench bench(kCheck + "centre = \"46 uH\"\nsigma = \"0.05 uH\"\n");
  bench.good_units(1);
  const auto lot = bench.inspected(recorded(bench), 3);
  EXPECT_EQ(lot.at("decision"), "undecided");
  EXPECT_EQ(lot.at("units").size(), 0u);
  EXPECT_EQ(lot.at("plan"), nullptr);
  EXPECT_EQ(lot.at("check_standard").at("state"), "never");
}

TEST(CheckStandard, InsideItsLimitsLetsTheLotBegin) {
  const LotBench bench(kCheck + "centre = \"46 uH\"\nsigma = \"0.05 uH\"\n");
  bench.good_units(1);
  bench.unit("CS-1", 46.05, 77);
  const auto lot = bench.inspected(recorded(bench));
  EXPECT_EQ(lot.at("check_standard").at("state"), "good");
  EXPECT_EQ(lot.at("units").size(), 1u) << "the standard is no unit of the lot";
  EXPECT_EQ(bench.inspected(recorded(bench)).at("check_standard").at("readings"), 1) << "the same capture counts once";
  bench.remove("CS-1");
  EXPECT_EQ(bench.inspected(recorded(bench)).at("check_standard").at("state"), "good") << "the ledger remembers it";
}

TEST(CheckStandard, OutOfItsLimitsStopsTheLotOrMarksIt) {
  for (const auto& [when_out, exit_code] : {std::pair{"refuse", 3}, {"mark", 0}}) {
    const LotBench bench(kCheck + "centre = \"46 uH\"\nsigma = \"0.05 uH\"\nwhen_out = \"" + when_out + "\"\n");
    bench.good_units(1);
    bench.unit("CS-1", 46.5, 77);
    const auto lot = bench.inspected(recorded(bench), exit_code);
    EXPECT_EQ(lot.at("check_standard").at("state"), "out");
    bool told = false;
    for (const auto& finding : lot.at("findings")) told = told || finding.at("code") == "check_standard";
    EXPECT_TRUE(told) << when_out;
  }
}

}  // namespace
}  // namespace coilassay::test

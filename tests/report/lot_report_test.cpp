// A lot as text, document and page: decision first, outside text harmless, readable without gnuplot.
#include "report/lot_report.h"

#include <gmock/gmock.h>

#include <nlohmann/json.hpp>

#include "report/lot_figures.h"
#include "report/lot_json.h"
#include "report/lot_text.h"
#include "report/lot_wording.h"
#include "tests/report/path_setting.h"
#include "tests/report/schema_check.h"

namespace coilassay::test {
namespace {

using testing::AllOf;
using testing::HasSubstr;
using testing::IsEmpty;
using testing::Not;

LimitVerdict limit_verdict(double value, Verdict verdict) {
  LimitVerdict v;
  v.quantity = "L_s";
  v.unit = Unit::henry;
  v.test = "ringdown";
  v.value = value;
  v.u = 0.1e-6;
  v.u_own = 0.02e-6;
  v.U = 0.2e-6;
  v.low = value - 0.2e-6;
  v.high = value + 0.2e-6;
  v.min = 37.6e-6;
  v.max = 56.4e-6;
  v.guard = 0.16e-6;
  v.p_conform = verdict == Verdict::pass ? 1 : 0;
  v.verdict = verdict;
  v.why = verdict == Verdict::pass ? "inside" : "2 µH outside max";
  v.from = "measured";
  return v;
}

LotUnitRecord unit(const std::string& serial, double value, Verdict verdict) {
  LotUnitRecord record;
  record.verdict = {serial, 1, verdict, {limit_verdict(value, verdict)}, {}};
  record.files = {{"ringdown", "lot/" + serial + ".csv", std::string(64, 'a')}};
  record.entry = 3;
  return record;
}

LotRecord made_up_lot() {
  LotRecord lot;
  lot.program = "coilassay 0.1.0";
  lot.when = *parse_utc_time("2026-03-04T10:22:00Z");
  lot.operator_name = "Ada <script>alert(1)</script>";
  lot.sheet.path = "drum.toml";
  lot.sheet.sha256 = std::string(64, 'b');
  lot.sheet.name = "drum-47";
  lot.sheet.revision = "C";
  Limit limit;
  limit.quantity = "L_s";
  limit.unit = Unit::henry;
  limit.min = 37.6e-6;
  limit.max = 56.4e-6;
  lot.sheet.limits = {limit};
  lot.lot = "04\"; } body { display: none } /* \x1b[31m";
  lot.lot_size = 500;
  lot.plan = *plan_for(lot.sheet.sampling, 5, Severity105::normal);
  lot.units = {unit("01", 47e-6, Verdict::pass), unit("02", 46e-6, Verdict::pass), unit("<b>03", 58.4e-6, Verdict::fail),
               unit("04", 48e-6, Verdict::pass), unit("05", 47.5e-6, Verdict::pass)};
  std::vector<UnitVerdict> verdicts;
  for (const LotUnitRecord& each : lot.units) verdicts.push_back(each.verdict);
  lot.decision = decide_lot(lot.sheet, *lot.plan, verdicts);
  lot.statistics = lot_values(verdicts);
  lot.findings = {{"stray_file", Severity::note, "not measured: 'notes\u202e.txt'", "", 1, Unit::one}};
  lot.ledger = LotLedger{"drum.ledger", 1, 6, std::string(64, 'c'), 6, 4};
  return lot;
}

std::string page_of(const LotRecord& lot) {
  const PathSetting nothing("/nonexistent");  // no gnuplot: the page is ours alone
  return lot_report(lot);
}

TEST(LotPage, BeginsWithTheDecisionAndHoldsWhatAReportMust) {
  const std::string page = page_of(made_up_lot());
  const std::size_t body = page.find("<body>");
  EXPECT_LT(page.find("Rejected", body), page.find("Units that do not pass", body));
  EXPECT_THAT(page, AllOf(HasSubstr("Content-Security-Policy"), HasSubstr("58.40 µH ± 0.20 µH"), HasSubstr("37.6 µH to 56.4 µH"),
                          HasSubstr(std::string(64, 'a')), HasSubstr(std::string(64, 'b')), HasSubstr(std::string(64, 'c')),
                          HasSubstr("Amendment"), HasSubstr("counter(page) \" of \" counter(pages)"), HasSubstr("Released by"),
                          HasSubstr("relates only to the units listed"), HasSubstr("\u2717 fails"), HasSubstr("apt install gnuplot")));
}

TEST(LotPage, LetsNoOutsideTextActInPageOrStyle) {
  const std::string page = page_of(made_up_lot());
  EXPECT_THAT(page, AllOf(Not(HasSubstr("<script")), Not(HasSubstr("<b>03")), HasSubstr("&lt;b&gt;03"), Not(HasSubstr("\x1b")),
                          Not(HasSubstr("\u202e"))));
  // In the style sheet the lot's name stands inside quotes and must not leave them.
  const std::size_t begin = page.find("<style>");
  const std::string style = page.substr(begin, page.find("</style>") - begin);
  EXPECT_THAT(style, AllOf(HasSubstr("Report 04\\000022\\00003b"), Not(HasSubstr("display: none }"))));
}

TEST(LotPage, OfALotThatWasNotBegunSaysWhy) {
  LotRecord lot = made_up_lot();
  lot.plan.reset();
  lot.units.clear();
  lot.statistics.clear();
  lot.decision = {};
  lot.decision.why = "no unit was measured: check standard CS-1 has not been measured";
  const std::string page = page_of(lot);
  EXPECT_THAT(page, AllOf(HasSubstr("Undecided"), HasSubstr("CS-1 has not been measured"), Not(HasSubstr("All units"))));
  EXPECT_EQ(schema_trouble(to_json(lot), "lot"), "");
}

TEST(LotDocument, KeepsToItsSchemaOnOneLineToo) {
  const LotRecord lot = made_up_lot();
  EXPECT_EQ(schema_trouble(to_json(lot), "lot"), "");
  const std::string line = to_json_line(lot);
  EXPECT_EQ(line.find('\n'), line.size() - 1);
  EXPECT_EQ(nlohmann::json::parse(line), nlohmann::json::parse(to_json(lot)));
  const UnitVerdict& one = lot.units[2].verdict;
  EXPECT_EQ(schema_trouble(unit_line(one, one, std::nullopt, false), "unit"), "");
}

TEST(LotText, FitsTheTerminalAndSpeaksAsciiWhereItMust) {
  for (const std::size_t width : {60u, 80u, 132u}) {
    const std::string text = to_text(made_up_lot(), {.script = Script::ascii, .color = false, .verbose = false, .width = width});
    EXPECT_EQ(text.find("Rejected"), 0u);
    std::istringstream lines(text);
    for (std::string line; std::getline(lines, line);) {
      EXPECT_LE(line.size(), width) << line;
      for (const char c : line) EXPECT_TRUE(c >= 0x20 && c < 0x7f) << line;
    }
  }
}

TEST(LotText, SaysOnceWhyUnitsHaveNoValue) {
  LotRecord lot = made_up_lot();
  LimitVerdict none = limit_verdict(0, Verdict::undecided);
  none.value.reset();
  none.why = "no capture of the test ringdown";
  LimitVerdict other = none;
  other.quantity = "R_s";
  lot.units[1].verdict = {"02", 1, Verdict::undecided, {none, other}, {}};
  const std::string text = to_text(lot, {.script = Script::utf8, .color = false, .verbose = false, .width = 200});
  EXPECT_THAT(text, HasSubstr("no value of L_s, R_s: no capture of the test ringdown"));
}

TEST(LotText, TellsAFindingOfManyUnitsOnce) {
  LotRecord lot = made_up_lot();
  const Finding wide{"guard_band_too_wide", Severity::caution, "L_s: the bench is too coarse", "L_s", 1, Unit::one};
  for (LotUnitRecord& each : lot.units) each.verdict.findings = {wide};
  const std::string text = to_text(lot, {.script = Script::utf8, .color = false, .verbose = false, .width = 200});
  EXPECT_THAT(text, HasSubstr("unit 01 and 4 more: L_s: the bench is too coarse"));
  EXPECT_EQ(text.find("too coarse"), text.rfind("too coarse"));
  EXPECT_THAT(page_of(lot), HasSubstr("unit 01 and 4 more"));
}

TEST(LotFigures, ShowEveryValueBetweenItsLimits) {
  const LotRecord lot = made_up_lot();
  const Figure figure = lot_values_figure(lot, 0);
  ASSERT_EQ(figure.panels.size(), 3u);
  double counted = 0;
  for (const double n : figure.panels[1].series[0].y) counted += n;
  EXPECT_EQ(counted, 5) << "every unit is in one bin";
  EXPECT_EQ(figure.panels[1].x_rules.size(), 2u);
  EXPECT_THAT(lot_values_figure(made_up_lot(), 0).panels[0].series.back().y, testing::ElementsAre(46e-6, 47e-6, 47.5e-6, 48e-6, 58.4e-6));
  EXPECT_THAT(operating_figure(lot).panels, IsEmpty()) << "every unit is looked at";
  EXPECT_THAT(check_figure(lot).panels, IsEmpty());
}

TEST(LotFigures, OfAPlanShowHowOftenItAccepts) {
  LotRecord lot = made_up_lot();
  lot.sheet.sampling.scheme = SamplingScheme::attributes;
  lot.plan = *plan_for(lot.sheet.sampling, 500, Severity105::normal);
  const Figure figure = operating_figure(lot);
  ASSERT_EQ(figure.panels.size(), 1u);
  EXPECT_EQ(figure.panels[0].series[0].y.front(), 100);
  EXPECT_EQ(figure.panels[0].x_rules, std::vector<double>{1.0});
}

// s = 2 of the values 1, 3, 5 about a common error: the parts' own spread is what the units' errors leave of it.
TEST(LotValuesOfUnits, KeepCommonErrorsApart) {
  std::vector<UnitVerdict> units;
  for (const double value : {1e-6, 3e-6, 5e-6}) {
    LimitVerdict limit = limit_verdict(value, Verdict::pass);
    limit.u = 5e-6;
    limit.u_own = 1e-6;
    units.push_back({"x", 1, Verdict::pass, {limit}, {}});
  }
  const auto values = lot_values(units);
  ASSERT_EQ(values.size(), 1u);
  EXPECT_NEAR(*values[0].deviation, 2e-6, 1e-15);
  EXPECT_NEAR(*values[0].spread, std::sqrt(3.0) * 1e-6, 1e-15);
  EXPECT_NEAR(values[0].u_common, std::sqrt(24.0) * 1e-6, 1e-15);
  // t = 4.303 for 2 degrees of freedom (any table of Student's t).
  EXPECT_NEAR(*values[0].U_mean, std::hypot(4.302653 * 2 / std::sqrt(3.0), 1.959964 * std::sqrt(24.0)) * 1e-6, 1e-11);
  units[0].limits[0].verdict = Verdict::not_comparable;
  EXPECT_EQ(lot_values(units)[0].n, 2u) << "a value under other conditions is none of these";
  EXPECT_THAT(lot_values({}), IsEmpty());
}

}  // namespace
}  // namespace coilassay::test

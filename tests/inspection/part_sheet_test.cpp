#include "inspection/part_sheet.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <fstream>
#include <map>
#include <sstream>

#include "analysis/symbols.h"
#include "base/number_text.h"
#include "inspection/sampling_tables.h"
#include "tests/support/paths.h"

namespace coilassay {
namespace {

using testing::ElementsAre;
using testing::HasSubstr;

constexpr std::string_view kWhole = R"toml([part]
name = "drum-47"
revision = "C"
supplier = "Reel Hall"
[[limit]]
quantity = "L_s"
min = "37.6 uH"
max = "56.4 uH"
test = "sweep"
at = { frequency = "100 kHz", level = "100 mV", bias = "0 A" }
[[limit]]
quantity = "I_sat_30"
min = "1.2 A"
test = "ramp"
at = { definition = "ramp_incremental" }
[tolerance_of_conditions]
frequency = "2 %"
level = "30 mV"
bias = "20 mA"
temperature = "5 degC"
[test.ramp]
bench = "ramp-bench.toml"
repeats = 3
from = "5 us"
dcr = "0.28 ohm ± 1 %"
[test.sweep]
at = ["1 MHz", "2 MHz"]
connection = "series"
[test.across]
kind = "ringdown"
capacitor = ["10 nF ± 1 %", "22 nF ± 1 %"]
capacitor_dissipation = "0.0005"
[decision]
rule = "guarded_acceptance"
risk = "2 %"
[sampling]
scheme = "attributes"
level = "S-4"
aql = 0.65
severity = "tightened"
undecided = "set_aside"
seed = 412
resumed = 2026-05-01
[retest]
attempts = 2
use = "mean"
[check_standard]
serial = "CS-1"
quantity = "L_s"
every = "4 h"
centre = "47.02 uH"
sigma = "20 nH"
when_out = "mark"
[gauge]
L_s = "12 nH"
)toml";

TEST(PartSheet, IsReadWithEveryKey) {
  const auto sheet = parse_part_sheet(kWhole, "parts/drum.toml");
  ASSERT_TRUE(sheet) << sheet.error().place << ": " << sheet.error().finding;
  EXPECT_EQ(sheet->name, "drum-47");
  EXPECT_EQ(sheet->revision, "C");
  EXPECT_EQ(sheet->supplier, "Reel Hall");
  EXPECT_EQ(sheet->sha256.size(), 64u);
  ASSERT_EQ(sheet->limits.size(), 2u);
  const Limit& l = sheet->limits[0];
  EXPECT_EQ(l.unit, Unit::henry);
  EXPECT_DOUBLE_EQ(*l.min, 37.6e-6);
  EXPECT_DOUBLE_EQ(*l.max, 56.4e-6);
  EXPECT_EQ(l.at.frequency_hz, 1e5);
  EXPECT_EQ(l.at.level_v, 0.1);
  EXPECT_FALSE(l.at.level_a);
  EXPECT_EQ(l.at.bias_a, 0.0);
  EXPECT_EQ(l.place, "parts/drum.toml:5");
  EXPECT_EQ(sheet->limits[1].at.definition, "ramp_incremental");
  EXPECT_FALSE(sheet->limits[1].max);
  EXPECT_TRUE(sheet->tolerances.frequency.relative);
  EXPECT_EQ(sheet->tolerances.frequency.value, 0.02);
  EXPECT_FALSE(sheet->tolerances.level.relative);
  EXPECT_EQ(sheet->tolerances.level.value, 0.03);
  EXPECT_EQ(sheet->tolerances.temperature.value, 5.0);
  ASSERT_EQ(sheet->tests.size(), 3u);
  const TestPlan& ramp = *sheet->find_test("ramp");
  EXPECT_EQ(ramp.bench, "parts/ramp-bench.toml");
  EXPECT_EQ(ramp.repeats, 3u);
  EXPECT_EQ(ramp.from_s, 5e-6);
  EXPECT_DOUBLE_EQ(ramp.dcr->half_width, 0.0028);
  EXPECT_THAT(frequencies_needed(*sheet, *sheet->find_test("sweep")), ElementsAre(1e5, 1e6, 2e6));
  const TestPlan& across = *sheet->find_test("across");
  EXPECT_EQ(across.kind, "ringdown");
  EXPECT_EQ(across.joint_captures(), 2u);
  EXPECT_EQ(sheet->decision.rule, DecisionRule::guarded_acceptance);
  EXPECT_EQ(sheet->decision.risk, 0.02);
  EXPECT_EQ(sheet->sampling.scheme, SamplingScheme::attributes);
  EXPECT_EQ(sheet->sampling.level, "S-4");
  EXPECT_EQ(sheet->sampling.aql_percent, 0.65);
  EXPECT_EQ(sheet->sampling.severity, Severity105::tightened);
  EXPECT_TRUE(sheet->sampling.undecided_set_aside);
  EXPECT_EQ(sheet->sampling.seed, 412u);
  EXPECT_EQ(to_text(*sheet->sampling.resumed), "2026-05-01T00:00:00Z");
  EXPECT_EQ(sheet->retest.attempts, 2u);
  EXPECT_EQ(sheet->retest.use, RetestUse::mean);
  EXPECT_EQ(sheet->check_standard->every_s, 4 * 3600.0);
  EXPECT_DOUBLE_EQ(*sheet->check_standard->sigma, 20e-9);
  EXPECT_FALSE(sheet->check_standard->refuse);
  EXPECT_DOUBLE_EQ(sheet->gauge_sigma.at("L_s"), 12e-9);
}

TEST(PartSheet, LimitsMayBeDeviationsFromANominalValue) {
  const auto limit = [](const std::string& keys) {
    const auto sheet = parse_part_sheet("[part]\nname = \"p\"\n[[limit]]\nquantity = \"L_s\"\n" + keys, "p.toml");
    EXPECT_TRUE(sheet) << sheet.error().finding;
    return sheet->limits.at(0);
  };
  const Limit both = limit("nominal = \"47 uH ± 20 %\"\n");
  EXPECT_NEAR(*both.min, 37.6e-6, 1e-18);
  EXPECT_NEAR(*both.max, 56.4e-6, 1e-18);
  const Limit uneven = limit("nominal = \"47 uH\"\nmin = \"-10 %\"\nmax = \"+30 %\"\n");
  EXPECT_NEAR(*uneven.min, 42.3e-6, 1e-18);
  EXPECT_NEAR(*uneven.max, 61.1e-6, 1e-18);
  const Limit one = limit("nominal = \"47 uH\"\nmin = \"-10 %\"\n");
  EXPECT_FALSE(one.max);
}

struct Refused {
  const char* from;   // replaced in the whole sheet
  const char* to;
  Problem problem;
  int line;
  const char* says;
};

TEST(PartSheet, IsRefusedWithItsLineWhereItMakesNoSense) {
  for (const Refused& row : {
           Refused{"revision = \"C\"", "revison = \"C\"", Problem::bad_sheet, 3, "revison"},
           Refused{"quantity = \"L_s\"\nmin", "quantity = \"L_x\"\nmin", Problem::bad_sheet, 6, "no quantity"},
           Refused{"\"37.6 uH\"", "\"37.6 uF\"", Problem::wrong_unit, 7, ""},
           Refused{"\"37.6 uH\"", "\"57.6 uH\"", Problem::bad_sheet, 7, "not below"},
           Refused{"\"37.6 uH\"", "\"37.6 uH ± 1 uH\"", Problem::bad_sheet, 7, "tolerance"},
           Refused{"\"37.6 uH\"", "\"-20 %\"", Problem::bad_sheet, 7, "no nominal value"},
           Refused{"test = \"sweep\"", "test = \"swep\"", Problem::bad_sheet, 5, "swep"},
           Refused{"\"ramp_incremental\"", "\"ramp\"", Problem::bad_sheet, 15, "definition"},
           Refused{"frequency = \"2 %\"", "frequency = 0.02", Problem::bad_sheet, 17, "needs a unit"},
           Refused{"repeats = 3", "repeats = 0", Problem::bad_number, 23, "repeats"},
           Refused{"dcr = ", "capacitor = ", Problem::bad_sheet, 25, "unknown key 'capacitor'"},
           Refused{"kind = \"ringdown\"", "kind = \"ring\"", Problem::bad_sheet, 30, "kind"},
           Refused{"rule = \"guarded_acceptance\"", "rule = \"guard\"", Problem::bad_sheet, 34, "guard"},
           Refused{"risk = \"2 %\"", "risk = \"60 %\"", Problem::bad_number, 35, "half"},
           Refused{"aql = 0.65", "aql = 0.7", Problem::bad_number, 39, "no column"},
           Refused{"level = \"S-4\"", "level = \"IV\"", Problem::bad_sheet, 38, "IV"},
           Refused{"sigma = \"20 nH\"\n", "", Problem::bad_sheet, 51, "go together"},
           Refused{"L_s = \"12 nH\"", "L_s = \"12 nF\"", Problem::wrong_unit, 55, ""},
           Refused{"L_s = \"12 nH\"", "L_q = \"12 nH\"", Problem::bad_sheet, 55, "L_q"},
       }) {
    std::string text(kWhole);
    const std::size_t at = text.find(row.from);
    ASSERT_NE(at, std::string::npos) << row.from;
    text.replace(at, std::string_view(row.from).size(), row.to);
    const auto sheet = parse_part_sheet(text, "p.toml");
    ASSERT_FALSE(sheet) << row.to;
    EXPECT_EQ(sheet.error().problem, row.problem) << row.to << ": " << sheet.error().finding;
    EXPECT_EQ(sheet.error().place, "p.toml:" + std::to_string(row.line)) << row.to << ": " << sheet.error().finding;
    EXPECT_THAT(sheet.error().finding, HasSubstr(row.says));
    EXPECT_FALSE(sheet.error().remedy.empty()) << row.to;
  }
}

TEST(PartSheet, WithoutAnyLimitIsNone) {
  const auto sheet = parse_part_sheet("[part]\nname = \"p\"\n", "p.toml");
  ASSERT_FALSE(sheet);
  EXPECT_THAT(sheet.error().finding, HasSubstr("no [[limit]]"));
  EXPECT_FALSE(parse_part_sheet("[[limit]]\nquantity = \"L_s\"\nmin = \"1 uH\"\n", "p.toml"));
  EXPECT_FALSE(parse_part_sheet("[part]\nname = \"p\"\n[[limit]]\nquantity = \"L_s\"\n", "p.toml"));
}

// What the page of formats says of each kind of test is what the sheet takes.
TEST(PartSheet, TheDocumentedQuantitiesOfEachKindAreThoseItTakes) {
  std::ifstream page(test::project_file("docs/formats.md"));
  std::stringstream whole;
  whole << page.rdbuf();
  const std::string text = whole.str();
  const std::size_t begin = text.find("What each kind of test gives"), end = text.find("An\ninstrument's own reading", begin);
  ASSERT_NE(end, std::string::npos);
  std::map<std::string, std::string> documented;   // words between one kind and the next
  std::string kind;
  std::stringstream words(text.substr(begin, end - begin));
  for (std::string word; words >> word;) {
    for (const char* each : {"ringdown", "ramp", "sine", "sweep", "coupling", "resistance"}) {
      if (word == each) kind = each;
    }
    std::erase_if(word, [](char c) { return c == '`' || c == ',' || c == ';' || c == '(' || c == ')' || c == '.'; });
    documented[kind] += word + " ";
  }
  for (const char* each : {"ringdown", "ramp", "sine", "sweep", "coupling", "resistance"}) {
    for (const Symbol& symbol : symbols()) {
      const bool said = (" " + documented[each]).find(" " + std::string(symbol.symbol) + " ") != std::string::npos;
      EXPECT_EQ(said, test_gives(each, symbol.symbol)) << each << " " << symbol.symbol;
    }
  }
  for (const double aql : attribute_aqls()) EXPECT_THAT(text, HasSubstr(" " + to_shortest(aql)));
}

TEST(PartSheet, KeysOfOneKindOfTestAreUnknownToAnother) {
  for (const char* test : {"[test.ramp]\nmaterial = \"copper\"\n", "[test.sweep]\ncapacitor = \"1 nF\"\n", "[test.ringdown]\nat = \"1 MHz\"\n",
                           "[test.resistance]\nskew = \"1 ns\"\n"}) {
    const auto sheet = parse_part_sheet(std::string("[part]\nname = \"p\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"1 uH\"\n") + test, "p.toml");
    ASSERT_FALSE(sheet) << test;
    EXPECT_THAT(sheet.error().finding, HasSubstr("unknown key")) << test;
  }
}

}  // namespace
}  // namespace coilassay

// Readings of a gauge study: from tables people type, and from the names of captures.
#include "app/runs/gauge_readings.h"

#include <gmock/gmock.h>

#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

std::vector<GaugeReading> table(const std::string& text, Unit unit = Unit::henry) {
  auto readings = parse_gauge_table(text, "t.csv", unit);
  EXPECT_TRUE(readings) << readings.error().place << ": " << readings.error().finding;
  return readings ? std::move(*readings) : std::vector<GaugeReading>{};
}

TEST(GaugeTable, IsReadInAnyOrderAndWithUnits) {
  const auto plain = table("part,operator,trial,value\n1,Ada,1,47.1e-6\n1,Ada,2,4.72e-5\n");
  ASSERT_EQ(plain.size(), 2u);
  EXPECT_DOUBLE_EQ(plain[1].value, 47.2e-6);
  EXPECT_EQ(plain[1].operator_name, "Ada");
  const auto headed = table("\xef\xbb\xbf" "value [uH];trial;part;operator;note\r\n47.1;a;7;Bo;first\r\n# a remark\r\n\r\n47.3 uH;b;7;Bo;\r\n");
  ASSERT_EQ(headed.size(), 2u);
  EXPECT_DOUBLE_EQ(headed[0].value, 47.1e-6);
  EXPECT_DOUBLE_EQ(headed[1].value, 47.3e-6);
  EXPECT_EQ(headed[0].part, "7");
  EXPECT_EQ(headed[0].trial, "a");
}

TEST(GaugeTable, IsRefusedWithItsLine) {
  struct Row {
    const char* text;
    Problem problem;
    const char* place;
  };
  for (const Row& row : {Row{"part,operator,value\n1,A,2\n", Problem::missing_column, "t.csv:1"},
                         Row{"part,operator,trial,value\n1,A,1,2 uH\n1,A,2\n", Problem::damaged, "t.csv:3"},
                         Row{"part,operator,trial,value\n1,A,1,2 uF\n", Problem::wrong_unit, "t.csv:2"},
                         Row{"part,operator,trial,value\n1,A,1,OL\n", Problem::bad_number, "t.csv:2"},
                         Row{"part,operator,trial,value\n", Problem::not_a_capture, "t.csv"}}) {
    const auto readings = parse_gauge_table(row.text, "t.csv", Unit::henry);
    ASSERT_FALSE(readings) << row.text;
    EXPECT_EQ(readings.error().problem, row.problem) << readings.error().finding;
    EXPECT_EQ(readings.error().place, row.place);
  }
}

TEST(GaugeFolderNames, GivePartOperatorTrialAndTest) {
  const TemporaryFolder folder;
  for (const char* name : {"10.ada.1.ringdown.csv", "9.ada.2.ringdown.csv.gz", "9.ada.1.ringdown.csv", "A.2.bo.1.ringdown.csv", "notes.txt",
                           "9.ringdown.csv", "bench.toml", "x.ada.1.ramp.csv"}) {
    folder.file(name, name);
  }
  const auto found = read_gauge_folder(folder.path(), std::vector<std::string>{"ringdown"});
  ASSERT_TRUE(found) << found.error().finding;
  std::vector<std::string> names;
  for (const GaugeCapture& c : found->captures) names.push_back(c.part + "|" + c.operator_name + "|" + c.trial);
  EXPECT_THAT(names, testing::ElementsAre("9|ada|1", "9|ada|2", "10|ada|1", "A.2|bo|1"));
  EXPECT_THAT(found->strays, testing::ElementsAre("9.ringdown.csv", "notes.txt", "x.ada.1.ramp.csv"));
  const TemporaryFolder empty;
  EXPECT_FALSE(read_gauge_folder(empty.path(), std::vector<std::string>{"ringdown"}));
  EXPECT_FALSE(read_gauge_folder(empty / "none", std::vector<std::string>{"ringdown"}));
}

}  // namespace
}  // namespace coilassay::test

// Files with several records: segments and simulator runs are kept apart, damage between rows is not taken for one.
#include <gtest/gtest.h>

#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using test::MadeFiles;

class TableRecords : public MadeFiles {};

std::string rows(int first, int count) {
  std::string text;
  for (int i = 0; i < count; ++i) text += std::to_string(i) + "e-6\t" + std::to_string(first + i) + "\n";
  return text;
}

TEST_F(TableRecords, TimeThatStartsAgainBeginsASegment) {
  const auto list = captures(made("segments.txt", "time\tCH1\n" + rows(10, 5) + rows(20, 4)));
  ASSERT_TRUE(list) << list.error().finding;
  ASSERT_EQ(list->size(), 2U);
  EXPECT_EQ((*list)[0].segment, "1");
  EXPECT_EQ((*list)[1].segment, "2");
  EXPECT_EQ((*list)[0].samples(), 5U);
  EXPECT_EQ((*list)[1].channels[0].samples, (std::vector<double>{20, 21, 22, 23}));
  EXPECT_EQ((*list)[1].time.step_s, 1e-6);
}

TEST_F(TableRecords, RunsOfASimulatorCarryTheirLine) {
  const auto list = captures(made("runs.txt", "time\tV(coil)\nStep Information: Rload=1K (Run: 1/2)\n" + rows(10, 5) +
                                                  "Step Information: Rload=2K (Run: 2/2)\n" + rows(20, 4)));
  ASSERT_TRUE(list) << list.error().finding;
  ASSERT_EQ(list->size(), 2U);
  EXPECT_EQ((*list)[0].segment, "Step Information: Rload=1K (Run: 1/2)");
  EXPECT_EQ((*list)[1].segment, "Step Information: Rload=2K (Run: 2/2)");
  EXPECT_EQ((*list)[0].channels[0].name, "V(coil)");
}

TEST_F(TableRecords, MarksOfBeginAndEndAreNoData) {
  const auto list = captures(made("marks.txt", "time\tCH1\nBEGIN\n" + rows(10, 5) + "END\n\n"));
  ASSERT_TRUE(list) << list.error().finding;
  ASSERT_EQ(list->size(), 1U);
  EXPECT_EQ(list->front().samples(), 5U);
  EXPECT_EQ(list->front().segment, "");
  EXPECT_EQ(list->front().channels[0].name, "CH1");
}

TEST_F(TableRecords, CommentsAmongTheRowsArePassedOver) {
  const auto list = captures(made("remarks.txt", "time\tCH1\n" + rows(10, 5) + "# a remark\n5e-6\t15\n"));
  ASSERT_TRUE(list) << list.error().finding;
  EXPECT_EQ(list->front().samples(), 6U);
}

TEST_F(TableRecords, WordsWithoutANewStartOfTimeAreDamage) {
  const auto list = captures(made("damaged.txt", "time\tCH1\n" + rows(10, 5) + "Segment 2\n5e-6\t15\n"));
  ASSERT_FALSE(list);
  EXPECT_EQ(list.error().problem, Problem::damaged);
  EXPECT_TRUE(list.error().place.ends_with(":7")) << list.error().place;
}

TEST_F(TableRecords, WithoutATimeColumnTheWordsMustSayIt) {
  const auto two = captures(made("two.txt", "Interval,1e-6\nCH1 (V)\nSegment 1\n1\n2\n3\nSegment 2\n4\n5\n6\n"));
  ASSERT_TRUE(two) << two.error().finding;
  ASSERT_EQ(two->size(), 2U);
  EXPECT_EQ((*two)[1].segment, "Segment 2");
  EXPECT_EQ((*two)[1].time.step_s, 1e-6);
  EXPECT_FALSE(captures(made("bad.txt", "Interval,1e-6\nCH1 (V)\n1\n2\n3\ntrigger lost\n4\n5\n6\n")));
}

TEST_F(TableRecords, ARecordWithoutASingleNumberIsLeftOutAndSaid) {
  const auto list = captures(made("runs.txt", "time\tV(a)\nStep Information: C=1n\n0\t1\n1e-6\t2\n2e-6\t3\nStep Information: C=2n\n0\tnan\n1e-6\tnan\n2e-6\tnan\n"));
  ASSERT_TRUE(list) << list.error().finding;
  ASSERT_EQ(list->size(), 1u);
  EXPECT_EQ(list->front().channels.size(), 1u);
  const Finding* said = test::found(list->front(), "missing_samples");
  ASSERT_NE(said, nullptr);
  EXPECT_NE(said->message.find("1 of 2 records hold no number"), std::string::npos) << said->message;
}

TEST_F(TableRecords, ARemarkBehindTheFirstRowsDoesNotMakeThemAPreamble) {
  const auto c = captures(made("remark.csv", "t (s),v (V)\n0,1\n1e-6,2\n# gain changed\n2e-6,3\n3e-6,4\n4e-6,5\n"));
  ASSERT_TRUE(c) << c.error().finding;
  EXPECT_EQ(c->front().samples(), 5u);
  EXPECT_EQ(c->front().channels.front().name, "v");
  // A remark that names the columns begins the table.
  const auto named = captures(made("named.csv", "1000,2\n# t (s),v (V)\n0,1\n1e-6,2\n2e-6,3\n3e-6,4\n"));
  ASSERT_TRUE(named) << named.error().finding;
  EXPECT_EQ(named->front().samples(), 4u);
}

}  // namespace
}  // namespace coilassay

// Stamps into a time axis: even steps are recognised through the rounding of their text, anything else is kept.
#include "acquire/table_time.h"

#include <fmt/format.h>
#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>
#include <cstdlib>

namespace coilassay {
namespace {

std::vector<double> stamps(std::size_t count, double start, double step, const char* form) {
  std::vector<double> list;
  for (std::size_t i = 0; i < count; ++i) {
    const std::string text = fmt::format(fmt::runtime(form), start + static_cast<double>(i) * step);
    list.push_back(std::strtod(text.c_str(), nullptr));
  }
  return list;
}

TimeStory story_of(const std::vector<double>& list, std::optional<double> stated = std::nullopt) {
  TimeFollower follower;
  const std::span<const double> all(list);
  for (std::size_t at = 0; at < list.size(); at += 30000) {
    const auto part = all.subspan(at, std::min<std::size_t>(30000, list.size() - at));
    EXPECT_EQ(follower.follow(part), part.size());
  }
  return follower.finish(stated);
}

TEST(TableTime, FindsStartAndStepAsTheyWereWritten) {
  const TimeStory s = story_of(stamps(1000, -1e-3, 4e-9, "{:.8e}"));
  EXPECT_TRUE(s.axis.uniform());
  EXPECT_EQ(s.axis.step_s, 4e-9);
  EXPECT_EQ(s.axis.start_s, -1e-3);
}

// "{:g}" keeps six digits: beyond 0.1 s at 1 us, stamps repeat and step back is impossible to see.
TEST(TableTime, SeesEvenStepsThroughStampsThatLostTheirDigits) {
  const std::vector<double> list = stamps(500000, 0, 1e-6, "{:g}");
  const TimeStory s = story_of(list);
  ASSERT_TRUE(s.axis.uniform());
  EXPECT_NEAR(s.axis.step_s, 1e-6, 1e-12);
  EXPECT_FALSE(s.every_stamp_twice);
}

TEST(TableTime, SeesEvenStepsThroughSinglePrecision) {
  std::vector<double> list;
  for (int i = 0; i < 200000; ++i) list.push_back(static_cast<double>(static_cast<float>(0.25 + i * 1e-8)));
  const TimeStory s = story_of(list);
  ASSERT_TRUE(s.axis.uniform());
  EXPECT_NEAR(s.axis.step_s, 1e-8, 1e-12);
}

TEST(TableTime, KeepsNoStampsOfALongEvenRecord) {
  const TimeStory s = story_of(stamps(1500000, -2e-3, 2e-9, "{:.9e}"));
  ASSERT_TRUE(s.axis.uniform());
  EXPECT_EQ(s.axis.step_s, 2e-9);
  EXPECT_EQ(s.axis.start_s, -2e-3);
}

TEST(TableTime, KeepsUnevenStamps) {
  std::vector<double> list;
  for (int i = 0; i < 100; ++i) list.push_back(i * 1e-6 + (i % 7) * 3e-8);
  const TimeStory s = story_of(list);
  EXPECT_FALSE(s.axis.uniform());
  EXPECT_EQ(s.axis.times_s, list);
  EXPECT_GT(s.largest_deviation_steps, 0.05);
}

TEST(TableTime, KeepsStampsThatTurnUnevenLate) {
  std::vector<double> list = stamps(1300000, 0, 1e-6, "{:.9e}");
  for (std::size_t i = 1200000; i < list.size(); ++i) list[i] += 5e-6;
  const TimeStory s = story_of(list);
  ASSERT_EQ(s.axis.times_s.size(), list.size());
  double worst = 0;
  for (std::size_t i = 0; i < list.size(); ++i) worst = std::max(worst, std::fabs(list[i] - s.axis.times_s[i]));
  EXPECT_LT(worst, 1e-9);  // written digits: half of the last is 5e-10
}

TEST(TableTime, RecognisesPairsOfPeakDetection) {
  std::vector<double> list;
  for (int i = 0; i < 100; ++i) list.push_back((i / 2) * 4e-6);
  const TimeStory s = story_of(list);
  EXPECT_TRUE(s.every_stamp_twice);
  EXPECT_NEAR(s.distinct_step_s, 4e-6, 1e-18);
  EXPECT_EQ(s.axis.times_s.size(), 100U);
}

TEST(TableTime, TakesSmallStepsBackForRounding) {
  const std::vector<double> list = {0, 1e-6, 2e-6, 3.1e-6, 3.0e-6, 5e-6, 6e-6};
  EXPECT_EQ(TimeFollower().follow(list), 7U);
}

TEST(TableTime, EndsTheRecordWhereTimeStartsAgain) {
  const std::vector<double> list = {0, 1e-6, 2e-6, 3e-6, 0, 1e-6, 2e-6};
  EXPECT_EQ(TimeFollower().follow(list), 4U);
}

TEST(TableTime, PrefersTheStatedStepWhereTheStampsAgree) {
  // Stamps of two digits could be many steps; the file says which.
  const TimeStory s = story_of(stamps(60, 0, 1.0 / 3, "{:.1f}"), 1.0 / 3);
  EXPECT_EQ(s.axis.step_s, 1.0 / 3);
}

}  // namespace
}  // namespace coilassay

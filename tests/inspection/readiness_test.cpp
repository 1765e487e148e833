#include "inspection/readiness.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

namespace coilassay {
namespace {

using namespace std::chrono;
using testing::HasSubstr;

constexpr UtcTime kShift = sys_days(year(2026) / 5 / 4) + hours(6);

TEST(Readiness, CalibrationIsOverdueFromTheDayAfter) {
  const std::vector<EquipmentItem> equipment{{"DMM-3", "", "", "2026-05-04"}, {"C-10n", "", "", "2026-05-01"}, {"shunt", "", "", ""}};
  EXPECT_TRUE(overdue_calibrations(equipment, year(2026) / 5 / 1).empty());
  const auto one = overdue_calibrations(equipment, year(2026) / 5 / 4);
  ASSERT_EQ(one.size(), 1u);
  EXPECT_EQ(one[0].code, "calibration_overdue");
  EXPECT_EQ(one[0].figure, 3 * 86400);
  EXPECT_THAT(one[0].message, HasSubstr("C-10n was due 2026-05-01, 3 days ago"));
  const auto two = overdue_calibrations(equipment, year(2026) / 5 / 10);
  ASSERT_EQ(two.size(), 2u);
  EXPECT_EQ(two[0].about, "C-10n") << "the most overdue first";
}

CheckStandard standard() {
  CheckStandard check;
  check.serial = "CS-1";
  check.quantity = "L_s";
  check.unit = Unit::henry;
  check.centre = 47e-6;
  check.sigma = 0.02e-6;
  return check;
}

CheckState state(const CheckStandard& check, const std::vector<CheckReading>& readings, UtcTime now) {
  return check_status(check, check_chart(check, readings), now).state;
}

TEST(Readiness, TheCheckStandardIsGoodWithinThreeSigmaAndForItsTime) {
  using enum CheckState;
  EXPECT_EQ(state(standard(), {}, kShift), never);
  EXPECT_EQ(state(standard(), {{kShift, 47.059e-6}}, kShift + hours(1)), good);
  EXPECT_EQ(state(standard(), {{kShift, 47.061e-6}}, kShift + hours(1)), out);
  EXPECT_EQ(state(standard(), {{kShift, 47.0e-6}}, kShift + hours(9)), overdue);
  EXPECT_EQ(state(standard(), {{kShift, 47.1e-6}, {kShift + minutes(5), 47.0e-6}}, kShift + hours(1)), good) << "put right since";
  EXPECT_EQ(state(standard(), {{kShift + hours(2), 47.0e-6}}, kShift), never) << "what is yet to come says nothing";
}

TEST(Readiness, WhenItIsOutTheLastGoodCheckIsNamed) {
  const CheckStandard check = standard();
  const CheckChart chart = check_chart(check, {{kShift, 47e-6}, {kShift + hours(8), 47.2e-6}});
  const CheckStatus status = check_status(check, chart, kShift + hours(8));
  EXPECT_EQ(status.state, CheckState::out);
  EXPECT_EQ(status.last_good, kShift);
  EXPECT_FALSE(status.may_inspect);
  EXPECT_THAT(status.why, HasSubstr("2026-05-04T06:00:00Z"));
  CheckStandard mark = check;
  mark.refuse = false;
  EXPECT_TRUE(check_status(mark, chart, kShift + hours(8)).may_inspect);
}

TEST(Readiness, ADriftWithinTheLimitsIsNamed) {
  const CheckStandard check = standard();
  std::vector<CheckReading> readings;
  for (int i = 0; i < 8; ++i) readings.push_back({kShift + hours(i), 47.005e-6});
  const auto status = [&] { return check_status(check, check_chart(check, readings), readings.back().time); };
  EXPECT_EQ(status().state, CheckState::good);
  EXPECT_EQ(status().trend, "8 in a row on one side");
  readings.push_back({kShift + hours(8), 46.995e-6});
  EXPECT_EQ(status().trend, "") << "the newest reading ends it";
}

TEST(Readiness, ItsFirstReadingsMakeTheChart) {
  CheckStandard check = standard();
  check.centre.reset();
  check.sigma.reset();
  check.baseline = 4;
  std::vector<CheckReading> readings;
  for (const double value : {46.9e-6, 47.1e-6, 46.9e-6, 47.1e-6}) readings.push_back({kShift + hours(readings.size()), value});
  const CheckChart chart = check_chart(check, readings);
  ASSERT_TRUE(chart.established);
  EXPECT_NEAR(chart.centre, 47e-6, 1e-15);
  EXPECT_NEAR(chart.sigma, 0.1154700538e-6, 1e-15);  // sqrt(4 x 0.01/3)
  EXPECT_NEAR(chart.high, 47e-6 + 3 * 0.1154700538e-6, 1e-15);
  readings.resize(3);
  EXPECT_EQ(state(check, readings, kShift + hours(3)), CheckState::not_established);
  EXPECT_TRUE(check_status(check, check_chart(check, readings), kShift + hours(3)).may_inspect);
}

}  // namespace
}  // namespace coilassay

#include "analysis/capture_checks.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/random.h"

namespace coilassay {
namespace {

/// A sine of `period` samples, with noise, seen by a converter with steps of `code` that ends at +-full_scale.
Channel seen(double amplitude, double period, double noise, double code, double full_scale, bool states_scale) {
  Channel channel;
  channel.name = "CH1";
  channel.unit = Unit::volt;
  channel.resolution = code;
  if (states_scale) channel.full_scale = full_scale;
  Random random(3);
  for (int i = 0; i < 4000; ++i) {
    double v = amplitude * std::sin(2 * M_PI * i / period + 0.3) + noise * random.normal();
    if (code > 0) v = std::round(v / code) * code;
    channel.samples.push_back(std::fmin(std::fmax(v, -full_scale), full_scale));
  }
  return channel;
}

TEST(FlatTops, FindsCrestsCutOffWithoutAStatedScale) {
  const auto tops = find_flat_tops(seen(1.5, 100, 0.002, 0.01, 1.0, false), 0, 4000);
  EXPECT_GE(tops.size(), 60U);  // 40 periods, two crests each
}

TEST(FlatTops, FindsCrestsAtTheStatedScaleHoweverShort) {
  EXPECT_FALSE(find_flat_tops(seen(1.02, 400, 0.0, 0.01, 1.0, true), 0, 4000).empty());
}

// The top of a slow sine on an 8-bit converter repeats one code tens of times: no clipping.
TEST(FlatTops, LeavesTheNaturalCrestOfASlowWaveAlone) {
  for (const double period : {50.0, 400.0, 2000.0}) {
    for (const double noise : {0.0, 0.004, 0.02}) {
      EXPECT_TRUE(find_flat_tops(seen(0.97, period, noise, 0.01, 2.0, true), 0, 4000).empty()) << period << " " << noise;
    }
  }
}

TEST(Range, SaysWhenFewCodesAreUsedAndHowMuchFinerTheRangeCouldBe) {
  const auto findings = check_range(seen(0.1, 50, 0.0, 0.01, 2.0, true), 0, 4000);
  ASSERT_EQ(findings.size(), 1U);
  EXPECT_EQ(findings[0].code, "coarse_range");
  EXPECT_EQ(findings[0].severity, Severity::caution);
  EXPECT_NEAR(findings[0].figure, 0.05, 0.006);
  EXPECT_TRUE(check_range(seen(1.9, 50, 0.0, 0.01, 2.0, true), 0, 4000).empty());
}

}  // namespace
}  // namespace coilassay

#include "inspection/value_law.h"

#include <gtest/gtest.h>

#include <cmath>

#include "tests/inspection/made_units.h"

namespace coilassay {
namespace {

using test::estimate;

Estimate with_factor(double k) {
  Estimate e = estimate("L_s", 0, 1);
  e.k = k;
  e.low = -k;
  e.high = k;
  return e;
}

TEST(ValueLaw, IsNormalForAFactorOfANormalInterval) {
  const auto law = ValueLaw::of(estimate("L_s", 10, 2));
  ASSERT_TRUE(law);
  EXPECT_NEAR(law->below(10 - 2 * 1.6448536269514722), 0.05, 1e-9);
  EXPECT_NEAR(law->above(10 + 2 * 3.090232306167814), 0.001, 1e-9);
  EXPECT_NEAR(law->reach_down(0.05), 2 * 1.6448536269514722, 1e-9);
  EXPECT_NEAR(law->inside(8, 12), 0.6826894921370859, 1e-8);
}

// Half and nine tenths of the variance rectangular, the rest normal, u = 1: factor, tails and the point of 5 % computed
// with scipy 1.10 by quadrature over the rectangular law (COMPUTED).
TEST(ValueLaw, BetweenNormalAndRectangularFollowsTheirConvolution) {
  struct Row {
    double k, tail_at_1, tail_at_1_6, point_of_5;
  };
  for (const Row& row : {Row{1.917423545366045, 0.1667439033062889, 0.05441090556266601, 1.637423975751699},
                         Row{1.7438441663291395, 0.19645546650060774, 0.04531310908823393, 1.5730283735199289}}) {
    const auto law = ValueLaw::of(with_factor(row.k));
    ASSERT_TRUE(law);
    EXPECT_NEAR(law->above(1.0), row.tail_at_1, 1e-8);
    EXPECT_NEAR(law->below(-1.6), row.tail_at_1_6, 1e-8);
    EXPECT_NEAR(law->reach_up(0.05), row.point_of_5, 1e-8);
  }
}

TEST(ValueLaw, OfOneRectangularErrorEndsWhereItEnds) {
  const auto law = ValueLaw::of(with_factor(0.95 * std::sqrt(3.0)));
  ASSERT_TRUE(law);
  EXPECT_EQ(law->above(1.7321), 0);
  EXPECT_NEAR(law->above(std::sqrt(3.0) / 2), 0.25, 1e-6);
}

// Student's t of 5 degrees of freedom: quantiles and tail from scipy 1.10 (COMPUTED), the quantiles as in any table.
TEST(ValueLaw, KeepsTheTailsOfFewDegreesOfFreedom) {
  const auto law = ValueLaw::of(with_factor(2.5705818366147395));
  ASSERT_TRUE(law);
  EXPECT_NEAR(law->reach_down(0.05), 2.015048372669157, 1e-6);
  EXPECT_NEAR(law->above(2.0), 0.05096973941492914, 1e-7);
}

TEST(ValueLaw, MeetsAnUnevenIntervalOnEachSide) {
  Estimate e = estimate("Q", 100, 5);
  e.low = 92;
  e.high = 114;
  const auto law = ValueLaw::of(e);
  ASSERT_TRUE(law);
  EXPECT_NEAR(law->below(92), 0.025, 1e-9);
  EXPECT_NEAR(law->above(114), 0.025, 1e-9);
  EXPECT_NEAR(law->below(100), 0.5, 1e-12);
}

TEST(ValueLaw, WithAnOpenEndSaysNothingBeyondTheValue) {
  Estimate e = estimate("Q", 100, 5);
  e.low = 90;
  e.high = HUGE_VAL;
  const auto law = ValueLaw::of(e);
  ASSERT_TRUE(law);
  EXPECT_NEAR(law->below(90), 0.025, 1e-9);
  EXPECT_EQ(law->above(1e9), 0.5);
}

TEST(ValueLaw, IsNotMadeUpWhereTheUncertaintyIsNotKnown) {
  Estimate e = estimate("L_s", 10, 1);
  e.quantity.standard_uncertainty = e.low = e.high = std::nan("");
  EXPECT_FALSE(ValueLaw::of(e));
}

TEST(ValueLaw, OfAnExactValueIsThatValue) {
  const auto law = ValueLaw::of(estimate("L_s", 10, 0));
  ASSERT_TRUE(law);
  EXPECT_EQ(law->inside(10, 12), 1);
  EXPECT_EQ(law->inside(10.1, 12), 0);
}

TEST(ValueLaw, GrowsByAnIndependentError) {
  const ValueLaw law = ValueLaw::normal(0, 3).widened(4);
  EXPECT_NEAR(law.u(), 5, 1e-12);
  EXPECT_NEAR(law.reach_up(0.025), 5 * 1.959963984540054, 1e-9);
  // A rectangular law with nine times its variance of normal error: one tenth is rectangular.
  const auto flat = ValueLaw::of(with_factor(0.95 * std::sqrt(3.0)))->widened(3);
  EXPECT_NEAR(flat.reach_up(0.025) / flat.u(), 1.959, 0.002);
}

}  // namespace
}  // namespace coilassay

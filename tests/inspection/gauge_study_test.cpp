#include "inspection/gauge_study.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <map>

#include "base/random.h"

namespace coilassay {
namespace {

using testing::HasSubstr;

struct Truth {
  double repeatability = 1, oper = 0.5, interaction = 0.5, part = 4;
};

std::vector<GaugeReading> simulated(const Truth& truth, int parts, int operators, int trials, std::uint64_t seed) {
  Random random(seed, 3);
  std::vector<double> of_operator;
  for (int o = 0; o < operators; ++o) of_operator.push_back(truth.oper * random.normal());
  std::vector<GaugeReading> readings;
  for (int p = 0; p < parts; ++p) {
    const double part = truth.part * random.normal();
    for (int o = 0; o < operators; ++o) {
      const double both = truth.interaction * random.normal();
      for (int t = 0; t < trials; ++t) {
        readings.push_back({"p" + std::to_string(p), "o" + std::to_string(o), std::to_string(t),
                            100 + part + of_operator[static_cast<std::size_t>(o)] + both + truth.repeatability * random.normal()});
      }
    }
  }
  return readings;
}

TEST(GaugeStudy, FindsTheDeviationsItWasMadeFrom) {
  // Many parts and operators, so that the answer itself is narrow: within 5 % for readings within, 15 % for the rest.
  const auto study = study_gauge(simulated({1, 2, 1.5, 5}, 100, 60, 3, 1), {});
  ASSERT_TRUE(study) << study.error().finding;
  EXPECT_FALSE(study->pooled);
  EXPECT_NEAR(study->component("repeatability").sigma, 1, 0.05);
  EXPECT_NEAR(study->component("interaction").sigma, 1.5, 0.1);
  EXPECT_NEAR(study->component("operator").sigma, 2, 0.45);
  EXPECT_NEAR(study->component("part").sigma, 5, 0.9);
  double shares = 0;
  for (const char* name : {"repeatability", "operator", "interaction", "part"}) shares += study->component(name).share;
  EXPECT_NEAR(shares, 1, 1e-12);
}

// 600 studies of 10 parts, 3 operators, 3 trials: coverage of the 95 % intervals. A limit of 93 % less three standard
// deviations of a binomial (0.9 %), for the operators' own (two degrees of freedom) and the sums with them likewise.
TEST(GaugeStudy, IntervalsCoverTheTruth) {
  constexpr int kStudies = 600;
  const Truth truth{1, 1, 0.8, 4};
  const double reproducibility = std::hypot(truth.oper, truth.interaction), gauge = std::hypot(truth.repeatability, reproducibility);
  const double total = std::hypot(gauge, truth.part);
  std::map<std::string, int> covered;
  GaugeOptions options;
  options.draws = 2000;
  options.pooling_probability = 1;   // never pooled: pooling is a choice by the data, and its bias is not what is tested here
  for (int i = 0; i < kStudies; ++i) {
    const auto study = study_gauge(simulated(truth, 10, 3, 3, static_cast<std::uint64_t>(i) + 10), options);
    ASSERT_TRUE(study);
    const auto holds = [&](const std::string& name, double low, double high, double value) {
      covered[name] += low <= value && value <= high;
    };
    for (const auto& [name, value] : {std::pair{"repeatability", truth.repeatability}, {"gauge", gauge}, {"part", truth.part}, {"total", total}}) {
      const GaugeComponent& c = study->component(name);
      holds(name, c.low, c.high, value);
    }
    holds("grr", study->grr_of_study.low, study->grr_of_study.high, gauge / total);
    holds("categories", study->categories.low, study->categories.high, std::sqrt(2.0) * truth.part / gauge);
  }
  for (const auto& [name, count] : covered) EXPECT_GT(count, 0.90 * kStudies) << name;
  for (const auto& [name, count] : covered) EXPECT_LE(count, 0.995 * kStudies) << name << " is wider than it needs";
}

TEST(GaugeStudy, OneOperatorHasRepeatabilityAlone) {
  const auto study = study_gauge(simulated({1, 0, 0, 4}, 10, 1, 3, 1), {});
  ASSERT_TRUE(study);
  EXPECT_EQ(study->component("reproducibility").sigma, 0);
  EXPECT_EQ(study->component("gauge").sigma, study->component("repeatability").sigma);
}

TEST(GaugeStudy, AgainstATolerance) {
  GaugeOptions options;
  options.tolerance = 100;
  const auto study = study_gauge(simulated({1, 0.5, 0, 4}, 10, 3, 3, 1), options);
  ASSERT_TRUE(study);
  EXPECT_NEAR(study->grr_of_tolerance->value, 6 * study->component("gauge").sigma / 100, 1e-12);
  EXPECT_EQ(study->judgement, "good");
}

TEST(GaugeStudy, IsRefusedWhereItIsNotCrossed) {
  auto readings = simulated({}, 3, 2, 2, 1);
  const auto refused = [](std::vector<GaugeReading> some) {
    const auto study = study_gauge(some, {});
    return study ? std::string("accepted") : study.error().finding;
  };
  auto fewer = readings;
  fewer.erase(fewer.begin() + 5);
  EXPECT_THAT(refused(fewer), HasSubstr("part p1, operator o0, trial 1 is missing"));
  auto twice = readings;
  twice.push_back(readings[0]);
  EXPECT_THAT(refused(twice), HasSubstr("is there twice"));
  auto none = readings;
  none[2].value = std::nan("");
  EXPECT_THAT(refused(none), HasSubstr("has no value"));
  EXPECT_THAT(refused(simulated({}, 1, 2, 2, 1)), HasSubstr("only one part"));
  EXPECT_THAT(refused(simulated({}, 3, 2, 1, 1)), HasSubstr("read once"));
  std::vector<GaugeReading> through;   // trials numbered through: a million combinations of a hundred readings
  for (int i = 0; i < 100; ++i) through.push_back({std::to_string(i), std::to_string(i), std::to_string(i), 1.0 * i});
  EXPECT_THAT(refused(through), HasSubstr("only 100 readings"));
  auto equal = readings;
  for (auto& reading : equal) reading.value = reading.part == "p0" ? 1 : 2;
  EXPECT_THAT(refused(equal), HasSubstr("last digit"));
}

// Two parts and one operator: the value says good, and the study cannot know.
TEST(GaugeStudy, TooSmallToBeSureSaysSo) {
  const auto small = study_gauge(simulated({0.1, 0, 0, 3}, 2, 1, 2, 3), {});
  ASSERT_TRUE(small);
  EXPECT_THAT(small->why, testing::Contains(HasSubstr("reaches from good to")));
  const auto large = study_gauge(simulated({0.1, 0.02, 0, 4}, 40, 10, 3, 3), {});
  EXPECT_THAT(large->why, testing::Each(testing::Not(HasSubstr("reaches from"))));
}

TEST(GaugeStudy, AGaugeThatCannotTellPartsApartIsPoor) {
  const auto study = study_gauge(simulated({1, 0.2, 0, 0.5}, 10, 3, 3, 4), {});
  ASSERT_TRUE(study);
  EXPECT_EQ(study->judgement, "poor");
  EXPECT_LT(study->ndc, 5u);
}

}  // namespace
}  // namespace coilassay

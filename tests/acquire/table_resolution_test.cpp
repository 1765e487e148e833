// The step of a converter, told from the step of its text.
#include "acquire/table_resolution.h"

#include <fmt/format.h>
#include <gtest/gtest.h>

#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <vector>

#include "base/random.h"

namespace coilassay {
namespace {

std::vector<double> converted(double step, double offset, const char* form, std::size_t count = 2000) {
  Random random(5);
  std::vector<double> list;
  for (std::size_t i = 0; i < count; ++i) {
    const double v = 3 * std::sin(0.01 * static_cast<double>(i)) + 0.02 * random.normal();
    const std::string text = fmt::format(fmt::runtime(form), offset + step * std::nearbyint(v / step));
    list.push_back(std::strtod(text.c_str(), nullptr));
  }
  return list;
}

TEST(Resolution, FindsTheStepOfAConverter) {
  EXPECT_EQ(find_resolution(converted(0.04, 0, "{:.2f}")), 0.04);
  EXPECT_NEAR(find_resolution(converted(0.03125, 0.001, "{:.5f}")), 0.03125, 1e-9);
}

TEST(Resolution, FindsItThroughTheRoundingOfTheText) {
  EXPECT_NEAR(find_resolution(converted(10.0 / 256, 0, "{:.4f}")), 10.0 / 256, 1e-5);
  EXPECT_NEAR(find_resolution(converted(10.0 / 4096, 0, "{:.6g}")), 10.0 / 4096, 1e-6);
}

TEST(Resolution, IsNotMistakenForTheLastDigitOfLongText) {
  EXPECT_TRUE(std::isnan(find_resolution(converted(1e-12, 0, "{:.6f}"))));
  EXPECT_TRUE(std::isnan(find_resolution(converted(1e-12, 0, "{:.9e}"))));
  EXPECT_TRUE(std::isnan(find_resolution(converted(1e-12, 0, "{:.17g}"))));
}

TEST(Resolution, IsTheTextsOwnWhereThatIsCoarse) { EXPECT_EQ(find_resolution(converted(1e-12, 0, "{:.2f}")), 0.01); }

TEST(Resolution, IsNotKnownOfAFewValues) {
  EXPECT_TRUE(std::isnan(find_resolution(std::vector<double>{1, 2, 3, 4})));
  EXPECT_TRUE(std::isnan(find_resolution(std::vector<double>(100, 0.5))));
  EXPECT_TRUE(std::isnan(find_resolution(std::vector<double>{})));
}

TEST(Resolution, PassesOverMissingSamples) {
  std::vector<double> list = converted(0.04, 0, "{:.2f}");
  list[10] = std::nan("");
  EXPECT_EQ(find_resolution(list), 0.04);
}

}  // namespace
}  // namespace coilassay

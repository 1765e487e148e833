#include <gtest/gtest.h>

#include <cmath>

#include "tests/support/ring_down_bench.h"

namespace coilassay {
namespace {

using test::covers;
using test::finding;
using test::simulated;

struct Series {
  std::vector<Capture> captures;
  RingDownRequest request;
};

Series three_capacitors(double tolerance) {
  Series series;
  series.request.bench.voltage.input_capacitance = StatedValue::exact(13e-12, Unit::farad);
  series.request.bench.voltage.input_resistance = StatedValue::exact(10e6, Unit::ohm);
  series.request.propagation.exact_bench = true;
  std::uint64_t seed = 1;
  for (const double c : {100e-12, 220e-12, 470e-12, 1e-9}) {
    synthetic::RingDownBench bench;
    bench.inductance_h = 150e-6;
    bench.resistance_ohm = 2;
    bench.capacitance_f = c;
    bench.parallel_capacitance_f = 12e-12;
    bench.noise_v = 3e-3;
    bench.seed = seed++;
    series.captures.push_back(simulated(bench).capture);
    series.request.bench.capacitors.push_back({StatedValue::rectangular(c, tolerance * c, Unit::farad), std::nullopt});
  }
  return series;
}

TEST(RingDownLine, GivesInductanceAndTheCoilsOwnCapacitance) {
  const Series series = three_capacitors(0.002);
  const auto result = measure_ring_down_line(series.captures, series.request);
  ASSERT_TRUE(result) << result.error().finding;
  ASSERT_NE(result->find("L"), nullptr);
  EXPECT_TRUE(covers(*result->find("L"), 150e-6));
  EXPECT_TRUE(covers(*result->find("C_par"), 12e-12));
  EXPECT_LT(result->find("C_par")->half_width(), 1.5e-12);
  ASSERT_NE(result->find("f_0"), nullptr);
  EXPECT_EQ(result->points.size(), 4U);
  EXPECT_FALSE(result->has_finding("model_misfit"));
}

TEST(RingDownLine, SaysWhenACapacitorIsNotWhatWasStated) {
  Series series = three_capacitors(0.002);
  series.request.bench.capacitors[2].value = StatedValue::rectangular(420e-12, 1e-12, Unit::farad);
  const auto result = measure_ring_down_line(series.captures, series.request);
  ASSERT_TRUE(result);
  ASSERT_TRUE(result->has_finding("model_misfit"));
  EXPECT_GT(result->find("L")->half_width(), 5e-6);
}

TEST(RingDownLine, CountsMustAgreeAndCapacitorsMustDiffer) {
  Series series = three_capacitors(0.01);
  series.request.bench.capacitors.pop_back();
  auto result = measure_ring_down_line(series.captures, series.request);
  ASSERT_FALSE(result);
  EXPECT_EQ(result.error().problem, Problem::usage);
  series = three_capacitors(0.01);
  for (auto& c : series.request.bench.capacitors) c.value = StatedValue::exact(1e-9, Unit::farad);
  result = measure_ring_down_line(series.captures, series.request);
  ASSERT_FALSE(result);
  EXPECT_NE(result.error().finding.find("same value"), std::string::npos);
}

}  // namespace
}  // namespace coilassay

// Ring-down against closed forms and constructed cases; each source stands beside its check.
#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

#include "analysis/ring_down.h"
#include "tests/support/ring_down_bench.h"

namespace coilassay {
namespace {

/// v(t) = exp(-alpha t) cos(w_d t + 0.4) written out by the closed form, no simulator between.
Capture closed_form(double omega0, double alpha, double step_s, std::size_t samples) {
  Capture capture;
  capture.source.name = "closed form";
  capture.time = {0, step_s, {}};
  Channel channel;
  channel.name = "CH1";
  channel.unit = Unit::volt;
  const double damped = std::sqrt(omega0 * omega0 - alpha * alpha);
  for (std::size_t n = 0; n < samples; ++n) {
    const double t = static_cast<double>(n) * step_s;
    channel.samples.push_back(std::exp(-alpha * t) * std::cos(damped * t + 0.4));
  }
  capture.channels.push_back(std::move(channel));
  return capture;
}

// Series R-L-C, L 100 uH, C 1 uF, R 0.5 ohm: w0 1e5, alpha 2500, Q 20, logarithmic decrement 0.1571287431.
// Textbook identities; the case is constructed (exact by algebra), checked independently.
TEST(PublishedRingDown, TextbookSeriesCircuit) {
  const Capture capture = closed_form(1.0e5, 2500, 1e-6, 2000);
  RingDownRequest request;
  request.propagation.exact_bench = true;
  request.bench.capacitors.push_back({StatedValue::exact(1e-6, Unit::farad), std::nullopt});
  const Measurement result = test::measured(capture, request);
  ASSERT_NE(result.find("L_s"), nullptr);
  // Noise-free data leave only rounding and the block approximation, none of it near 1e-8.
  EXPECT_NEAR(result.find("L_s")->quantity.value, 100e-6, 1e-8 * 100e-6);
  EXPECT_NEAR(result.find("R_s")->quantity.value, 0.5, 1e-7 * 0.5);
  EXPECT_NEAR(result.find("Q")->quantity.value, 20.0, 1e-6);
  EXPECT_NEAR(result.find("alpha")->quantity.value, 2500, 1e-4);
  const double decrement = result.find("alpha")->quantity.value / result.find("f_d")->quantity.value;
  EXPECT_NEAR(decrement, 0.1571287431, 1e-8);
}

// Resonance against added capacitance: NBS Circular 74, section 19, and Howe 1911 (method; both rules read in public notes,
// algebra verified). No published table was found: the case is constructed with L 150 uH and C0 12 pF.
TEST(PublishedRingDown, SelfCapacitanceLine) {
  const std::vector<std::pair<double, double>> table{{100e-12, 1227907.0441}, {150e-12, 1020979.4360},
                                                     {200e-12, 892496.6027},  {300e-12, 735693.9847},
                                                     {400e-12, 640215.0720},  {500e-12, 574300.9327}};
  std::vector<Capture> captures;
  RingDownRequest request;
  request.propagation.exact_bench = true;
  for (const auto& [farad, hertz] : table) {
    captures.push_back(closed_form(2 * std::numbers::pi * hertz, 2e4, 20e-9, 8000));
    request.bench.capacitors.push_back({StatedValue::exact(farad, Unit::farad), std::nullopt});
  }
  const auto result = measure_ring_down_line(captures, request);
  ASSERT_TRUE(result);
  // The table's frequencies carry eleven digits; the intercept loses two of them.
  EXPECT_NEAR(result->find("L")->quantity.value, 150e-6, 1e-7 * 150e-6);
  EXPECT_NEAR(result->find("C_par")->quantity.value, 12e-12, 1e-6 * 12e-12);
}

// The rule of the double frequency: C0 = (C1 - 4 C2)/3 where C1 resonates at f and C2 at 2 f (same sources).
TEST(PublishedRingDown, DoubleFrequencyRule) {
  const double c0 = 12e-12, c2 = 50e-12, c1 = 4 * c2 + 3 * c0;
  const double omega = 1 / std::sqrt(150e-6 * (c1 + c0));
  RingDownRequest request;
  request.propagation.exact_bench = true;
  for (const double c : {c1, c2}) request.bench.capacitors.push_back({StatedValue::exact(c, Unit::farad), std::nullopt});
  const auto result = measure_ring_down_line(
      {closed_form(omega, 2e4, 20e-9, 8000), closed_form(2 * omega, 2e4, 20e-9, 8000)}, request);
  ASSERT_TRUE(result);
  EXPECT_NEAR(result->find("C_par")->quantity.value, c0, 1e-6 * c0);
}

}  // namespace
}  // namespace coilassay

// JCGM 100:2008, H.2, Tables H.2 and H.3: resistance and reactance measured simultaneously (observations and results READ;
// the third digit of the output correlations from memory; all recomputed to full precision with an independent program).
#include <gtest/gtest.h>

#include <array>
#include <cmath>

#include "analysis/budget.h"

namespace coilassay {
namespace {

constexpr std::array kVolts = {5.007, 4.994, 5.005, 4.990, 4.999};
constexpr std::array kAmps = {0.019663, 0.019639, 0.019640, 0.019685, 0.019678};
constexpr std::array kPhase = {1.0456, 1.0438, 1.0468, 1.0428, 1.0433};

/// Means of the five observations and the covariance of the means (JCGM 100, 5.2.3).
FittedInputs observed() {
  Eigen::Matrix<double, 5, 3> x;
  for (Eigen::Index i = 0; i < 5; ++i) {
    const auto k = static_cast<std::size_t>(i);
    x.row(i) << kVolts[k], kAmps[k], kPhase[k];
  }
  FittedInputs fitted;
  fitted.values = x.colwise().mean();
  const Eigen::MatrixXd centred = x.rowwise() - fitted.values.transpose();
  fitted.covariance = centred.transpose() * centred / (5.0 * 4.0);
  return fitted;
}

Measurement propagated(const PropagationOptions& options) {
  Measurement m;
  add_estimates(m, {}, observed(), {{"R_s"}, {"X_s"}, {"Z"}},
                [](std::span<const double> in, std::span<double> out) {
                  out[0] = in[0] / in[1] * std::cos(in[2]);
                  out[1] = in[0] / in[1] * std::sin(in[2]);
                  out[2] = in[0] / in[1];
                },
                {}, options);
  return m;
}

double correlation(const Measurement& m, std::string_view a, std::string_view b) {
  for (const auto& c : m.correlations) {
    if ((c.a == a && c.b == b) || (c.a == b && c.b == a)) return c.value;
  }
  return std::nan("");
}

TEST(GumH2, InputsHaveTheTabulatedUncertaintiesAndCorrelations) {
  const FittedInputs in = observed();
  EXPECT_NEAR(in.values[0], 4.9990, 5e-5);
  EXPECT_NEAR(in.values[1], 0.0196610, 5e-8);
  EXPECT_NEAR(in.values[2], 1.04446, 5e-6);
  EXPECT_NEAR(std::sqrt(in.covariance(0, 0)), 0.0032, 5e-5);
  EXPECT_NEAR(std::sqrt(in.covariance(1, 1)), 0.0000095, 5e-8);
  EXPECT_NEAR(std::sqrt(in.covariance(2, 2)), 0.00075, 5e-6);
  const auto r = [&](int a, int b) { return in.covariance(a, b) / std::sqrt(in.covariance(a, a) * in.covariance(b, b)); };
  EXPECT_NEAR(r(0, 1), -0.36, 0.005);
  EXPECT_NEAR(r(0, 2), 0.86, 0.005);
  EXPECT_NEAR(r(1, 2), -0.65, 0.005);
}

TEST(GumH2, ResistanceReactanceAndImpedanceComeOutToThePrintedDigits) {
  const Measurement m = propagated({});
  const struct {
    const char* symbol;
    double value, u, exact_value, exact_u;
  } rows[] = {{"R_s", 127.732, 0.071, 127.73216992810208, 0.07107140739699547},
              {"X_s", 219.847, 0.295, 219.84651191263848, 0.295581677358644},   // 0.2956: the table cuts off
              {"Z", 254.260, 0.236, 254.25970194801894, 0.23633613008237755}};
  for (const auto& row : rows) {
    const Estimate* e = m.find(row.symbol);
    ASSERT_NE(e, nullptr);
    EXPECT_NEAR(e->quantity.value, row.value, 5.1e-4) << row.symbol;
    EXPECT_NEAR(e->quantity.standard_uncertainty, row.u, 6e-4) << row.symbol;
    EXPECT_NEAR(e->quantity.value / row.exact_value, 1, 1e-12) << row.symbol;
    // Central differences over one u: exact to second order.
    EXPECT_NEAR(e->quantity.standard_uncertainty / row.exact_u, 1, 1e-5) << row.symbol;
  }
  EXPECT_NEAR(correlation(m, "R_s", "X_s"), -0.588, 6e-4);
  EXPECT_NEAR(correlation(m, "R_s", "Z"), -0.485, 6e-4);
  EXPECT_NEAR(correlation(m, "X_s", "Z"), 0.993, 6e-4);
}

TEST(GumH2, TrialsAgreeWithFirstOrder) {
  const Measurement m = propagated({.by_trials = true, .trials = 200000, .seed = 4});
  EXPECT_NEAR(m.find("R_s")->quantity.standard_uncertainty, 0.0711, 5e-4);
  EXPECT_NEAR(m.find("X_s")->quantity.standard_uncertainty, 0.2956, 2e-3);
  EXPECT_NEAR(m.find("Z")->quantity.standard_uncertainty, 0.2363, 2e-3);
}

}  // namespace
}  // namespace coilassay

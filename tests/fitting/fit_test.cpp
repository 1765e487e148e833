#include "fitting/fit.h"

#include <gtest/gtest.h>

namespace coilassay {
namespace {

Fit good_fit() {
  Fit fit;
  fit.parameters = Eigen::Vector2d(1.0, 2.0);
  fit.covariance = Eigen::Matrix2d{{0.04, 0.03}, {0.03, 0.09}};
  fit.stop = FitStop::converged;
  fit.at_bound = {false, false};
  return fit;
}

TEST(Fit, UncertaintyAndCorrelationComeFromTheCovariance) {
  const Fit fit = good_fit();
  EXPECT_DOUBLE_EQ(fit.standard_uncertainty(0), 0.2);
  EXPECT_DOUBLE_EQ(fit.standard_uncertainty(1), 0.3);
  EXPECT_DOUBLE_EQ(fit.correlation(0, 1), 0.5);
  EXPECT_TRUE(fit.usable());
}

TEST(Fit, IsNotUsableWhenItStoppedForAnyOtherReasonThanConvergence) {
  for (const FitStop stop : {FitStop::max_iterations, FitStop::failed, FitStop::rank_deficient}) {
    Fit fit = good_fit();
    fit.stop = stop;
    EXPECT_FALSE(fit.usable()) << name(stop);
  }
}

TEST(Fit, IsNotUsableAtABoundOrWithoutCovarianceOrWithANumberThatIsNone) {
  Fit fit = good_fit();
  fit.at_bound[1] = true;
  EXPECT_FALSE(fit.usable());
  fit = good_fit();
  fit.covariance.resize(0, 0);
  EXPECT_FALSE(fit.usable());
  EXPECT_TRUE(std::isnan(fit.standard_uncertainty(0)));
  EXPECT_TRUE(std::isnan(fit.correlation(0, 1)));
  fit = good_fit();
  fit.parameters[0] = std::nan("");
  EXPECT_FALSE(fit.usable());
  fit = good_fit();
  fit.covariance(1, 1) = 0;
  EXPECT_FALSE(fit.usable());
}

}  // namespace
}  // namespace coilassay

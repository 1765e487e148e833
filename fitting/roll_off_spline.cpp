#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>

#include "fitting/roll_off_fit.h"

namespace coilassay {

namespace {

constexpr int kKnots = 10;                        // both ends included
constexpr int kPieces = kKnots - 1;
constexpr int kCoefficients = kPieces + 3;

/// Values or slopes of the four cubic B-splines on piece `first` at the place t of it, 0 <= t <= 1.
Eigen::Vector4d basis(double t) {
  const double u = 1 - t;
  return Eigen::Vector4d(u * u * u, 3 * t * t * t - 6 * t * t + 4, 3 * u * u * u - 6 * u * u + 4, t * t * t) / 6;
}
Eigen::Vector4d basis_slope(double t) {
  const double u = 1 - t;
  return Eigen::Vector4d(-u * u, 3 * t * t - 4 * t, -(3 * u * u - 4 * u), t * t) / 2;
}

struct Place {
  int piece;
  double t;
};
Place place_of(double x, double low, double high) {
  const double at = (x - low) / (high - low) * kPieces;
  const int piece = std::clamp(static_cast<int>(at), 0, kPieces - 1);
  return {piece, at - piece};
}

}  // namespace

Result<RollOffSpline> RollOffSpline::fit(const RollOffBlocks& blocks) {
  RollOffSpline spline;
  if (blocks.x.size() < 3 * kCoefficients) {
    return failure(Problem::too_few_samples, "spline", std::to_string(blocks.x.size()) + " blocks of samples", "");
  }
  const auto [low, high] = std::minmax_element(blocks.x.begin(), blocks.x.end());
  spline.low_ = *low;
  spline.high_ = *high;
  Eigen::Matrix<double, kCoefficients, kCoefficients> normal = Eigen::Matrix<double, kCoefficients, kCoefficients>::Zero();
  Eigen::Matrix<double, kCoefficients, 1> right = Eigen::Matrix<double, kCoefficients, 1>::Zero();
  for (std::size_t i = 0; i < blocks.x.size(); ++i) {
    const Place at = place_of(blocks.x[i], *low, *high);
    const Eigen::Vector4d b = basis(at.t);
    normal.block<4, 4>(at.piece, at.piece) += b * b.transpose();
    right.segment<4>(at.piece) += blocks.y[i] * b;
  }
  const auto solver = normal.ldlt();
  spline.coefficients_ = solver.solve(right);
  if (solver.info() != Eigen::Success || !spline.coefficients_.allFinite() || solver.vectorD().minCoeff() < 1e-9) {
    return failure(Problem::rank_deficient, "spline", "the samples leave a piece of the span empty", "");
  }
  double square = 0;
  for (std::size_t i = 0; i < blocks.x.size(); ++i) {
    const double r = blocks.y[i] - spline.y(blocks.x[i]);
    square += r * r;
  }
  const double count = static_cast<double>(blocks.x.size()) - kCoefficients;
  spline.lack_of_fit_ = square / count / (blocks.sigma_of_mean * blocks.sigma_of_mean);
  return spline;
}

double RollOffSpline::y(double x) const {
  const Place at = place_of(x, low_, high_);
  return coefficients_.segment<4>(at.piece).dot(basis(at.t));
}

double RollOffSpline::slope(double x) const {
  const Place at = place_of(x, low_, high_);
  const double per_x = kPieces / (high_ - low_);
  return 1 / (per_x * coefficients_.segment<4>(at.piece).dot(basis_slope(at.t)));
}

}  // namespace coilassay

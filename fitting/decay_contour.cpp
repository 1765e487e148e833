#include "fitting/decay_contour.h"

#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <numbers>

namespace coilassay {

namespace {

constexpr std::size_t kBlocks = 96;

/// Means of blocks of samples: a damped exponential stays one, with the same decay and frequency.
struct BlockMeans {
  double length = 1;
  std::vector<double> at, mean, weight;   // place in samples, value, present samples

  BlockMeans(std::span<const double> y) {
    const std::size_t block = std::max<std::size_t>(y.size() / kBlocks, 1);
    length = static_cast<double>(block);
    for (std::size_t first = 0; first + block <= y.size(); first += block) {
      double sum = 0, count = 0;
      for (std::size_t i = first; i < first + block; ++i) {
        if (std::isnan(y[i])) continue;
        sum += y[i];
        count += 1;
      }
      if (count == 0) continue;
      at.push_back(static_cast<double>(first));
      mean.push_back(sum / count);
      weight.push_back(count);
    }
  }

  /// Chi-square in units of the variance of one sample, linear parameters at their best.
  double operator()(const DecayPoint& p) const {
    Eigen::Matrix3d normal = Eigen::Matrix3d::Zero();
    Eigen::Vector3d right = Eigen::Vector3d::Zero();
    double square = 0;
    for (std::size_t k = 0; k < at.size(); ++k) {
      const Eigen::Vector3d row = basis(p, at[k]);
      normal.noalias() += weight[k] * row * row.transpose();
      right += weight[k] * mean[k] * row;
      square += weight[k] * mean[k] * mean[k];
    }
    const Eigen::Vector3d linear = normal.ldlt().solve(right);
    return square - right.dot(linear);
  }

 private:
  /// Two functions that span the decay, of order one, and the offset. Far beyond critical damping the two exponentials
  /// themselves, whose hyperbolic form would overflow.
  static Eigen::Vector3d basis(const DecayPoint& p, double n) {
    const double w = std::sqrt(std::fabs(p.q));
    if (p.q < 0 && w > 0.2 * p.a) {
      const double slow = (p.a * p.a + p.q) / (p.a + w);   // a - w without cancellation
      return {std::exp(-slow * n), std::exp(-(p.a + w) * n), 1};
    }
    const DampedSine cosine{p.a, p.q, 1, 0, 0}, sine{p.a, p.q, 0, 1, 0};
    return {cosine(n), sine(n) * std::fmax(p.a, w), 1};
  }
};

/// Coefficients of 1 + T s + P s^2.
struct Coefficients {
  double t = 0, p = 0;
  DecayPoint point() const {
    const double a = t / (2 * p);
    return {a, 1 / p - a * a};
  }
};

}  // namespace

DecayContour decay_contour(std::span<const double> y, const DampedSineFit& fit, double rise, int directions) {
  DecayContour contour;
  // Rounding without dither errs by the signal: its share stands in the covariance alone and no chi-square shows it.
  if (fit.fit.covariance.size() == 0 || !(fit.sigma > 0) || fit.undithered) return contour;
  const double a = fit.model.a, square = a * a + fit.model.q;
  if (!(a > 0) || !(square > 0)) return contour;
  const Coefficients best{2 * a / square, 1 / square};
  Eigen::Matrix2d slope;   // of (T, P) with (a, q)
  slope << 2 / square - 4 * a * a / (square * square), -2 * a / (square * square), -2 * a / (square * square),
      -1 / (square * square);
  const Eigen::Matrix2d covariance = slope * fit.fit.covariance.topLeftCorner(2, 2) * slope.transpose();
  const Eigen::LLT<Eigen::Matrix2d> root(covariance);
  if (root.info() != Eigen::Success) return contour;
  const Eigen::Matrix2d scale = root.matrixL();
  const BlockMeans chi_square(y);
  const double variance = fit.sigma * fit.sigma;
  const double least = chi_square(best.point());

  const auto at = [&](const Eigen::Vector2d& way, double r) {
    return Coefficients{best.t + r * way[0], best.p + r * way[1]};
  };
  // The shortest time constant that a block can show; below, the fast exponential is gone within the first of them.
  const double shortest = 0.1 * chi_square.length;
  const auto possible = [&](const Coefficients& c) { return c.t > 0 && c.p > shortest * c.t; };
  const auto inside = [&](const Coefficients& c) {
    return possible(c) && (chi_square(c.point()) - least) / variance < rise;
  };
  for (int k = 0; k < directions; ++k) {
    const double angle = 2 * std::numbers::pi * k / directions;
    const Eigen::Vector2d way = scale * Eigen::Vector2d(std::cos(angle), std::sin(angle));
    double low = 0, high = std::sqrt(rise);
    for (int more = 0; more < 16 && inside(at(way, high)); ++more) {
      low = high;
      high *= 1.5;
    }
    for (int halving = 0; halving < 7; ++halving) {
      const double middle = (low + high) / 2;
      (inside(at(way, middle)) ? low : high) = middle;
    }
    contour.open = contour.open || !possible(at(way, low * 1.01 + 1e-9));
    contour.points.push_back(at(way, low).point());
  }
  return contour;
}

}  // namespace coilassay

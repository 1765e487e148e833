#include "fitting/damped_sine_search.h"

#include <Eigen/Cholesky>
#include <algorithm>
#include <numbers>

namespace coilassay {

bool ShapeLimits::allow(const Shape& shape) const {
  return std::isfinite(shape.a) && std::isfinite(shape.q) && shape.slow_decay() > least_slow_decay &&
         shape.fast_decay() < greatest_fast_decay && shape.q < std::numbers::pi * std::numbers::pi;
}

ShapeLimits shape_limits(std::size_t samples) {
  return {-1.0 / static_cast<double>(samples), 3.0};
}

namespace {

// Solves (H + damping of the shapes) x = g on unit-diagonal scale; false when H is singular there.
//
// Steps are taken in a and a^2 + q, the sum and the product of the two decay rates. When overdamped the data fix one
// rate much better than the other: a line in these coordinates, but a bent valley in a and q.
template <int Modes>
bool damped_step(const Equations<Modes>& at, const Shapes<Modes>& shapes, double damping,
                 Eigen::Matrix<double, Equations<Modes>::kAll, 1>& step) {
  constexpr int n = Equations<Modes>::kAll;
  Eigen::Matrix<double, n, n> turn = Eigen::Matrix<double, n, n>::Identity();
  for (int mode = 0; mode < Modes; ++mode) turn(4 * mode + 1, 4 * mode) = -2 * shapes[static_cast<std::size_t>(mode)].a;
  const Eigen::Matrix<double, n, n> normal = turn.transpose() * at.normal * turn;
  const Eigen::Matrix<double, n, 1> scale = normal.diagonal().cwiseSqrt();
  if (!(scale.array() > 0).all() || !scale.allFinite()) return false;
  const Eigen::Matrix<double, n, 1> inverse = scale.cwiseInverse();
  Eigen::Matrix<double, n, n> scaled = inverse.asDiagonal() * normal * inverse.asDiagonal();
  for (int mode = 0; mode < Modes; ++mode) {
    scaled(4 * mode, 4 * mode) += damping;
    scaled(4 * mode + 1, 4 * mode + 1) += damping;
  }
  const Eigen::LDLT<Eigen::Matrix<double, n, n>> solver(scaled);
  if (solver.info() != Eigen::Success || !(solver.vectorD().minCoeff() > 1e-15)) return false;
  const Eigen::Matrix<double, n, 1> gradient = turn.transpose() * at.gradient;
  step = turn * solver.solve(inverse.cwiseProduct(gradient)).cwiseProduct(inverse);
  return step.allFinite();
}

// What an undamped step from here would win: the distance to the solution in units of uncertainty, squared, times the
// noise variance. Infinite where the equations are singular.
template <int Modes>
double decrement(const Equations<Modes>& at, const Shapes<Modes>& shapes) {
  Eigen::Matrix<double, Equations<Modes>::kAll, 1> step;
  if (!damped_step<Modes>(at, shapes, 0, step)) return std::numeric_limits<double>::infinity();
  return step.dot(at.gradient);
}

// Chi-square is a difference of large sums: below this it is rounding.
constexpr double kRounding = 1e-14;

}  // namespace

template <int Modes>
Solution<Modes> refine(const WhiteBlocks& blocks, const Shapes<Modes>& start, const ShapeLimits& limits) {
  constexpr int kMostIterations = 100;
  Solution<Modes> best{
      .shapes = start, .at = equations<Modes>(blocks, start), .variance = 0, .iterations = 0, .converged = false};
  if (!best.at.solvable) return best;
  const double dof = std::max(1.0, static_cast<double>(blocks.values_used()) - Equations<Modes>::kAll);
  double left = decrement<Modes>(best.at, best.shapes);
  double damping = 1e-3;
  while (best.iterations < kMostIterations && damping < 1e10) {
    best.variance = best.at.chi_square / dof;
    const double noise = std::max(best.variance, 1e-24 * blocks.energy);
    if (left < 1e-8 * noise) {
      best.converged = true;
      return best;
    }
    Eigen::Matrix<double, Equations<Modes>::kAll, 1> step;
    ++best.iterations;
    if (!damped_step<Modes>(best.at, best.shapes, damping, step)) {
      damping *= 10;
      continue;
    }
    Shapes<Modes> next = best.shapes;
    bool allowed = true;
    for (int mode = 0; mode < Modes; ++mode) {
      Shape& shape = next[static_cast<std::size_t>(mode)];
      shape.a += step[4 * mode];
      shape.q += step[4 * mode + 1] - step[4 * mode] * step[4 * mode];
      allowed = allowed && limits.allow(shape);
    }
    if (allowed) {
      Equations<Modes> there = equations<Modes>(blocks, next);
      if (there.solvable) {
        const double left_there = decrement<Modes>(there, next);
        const bool blurred = step.dot(best.at.gradient) < kRounding * blocks.energy;
        if (blurred ? left_there < left : there.chi_square < best.at.chi_square) {
          best.shapes = next;
          best.at = std::move(there);
          left = left_there;
          damping = std::max(damping / 10, 1e-12);
          continue;
        }
        if (blurred && damping <= 1e-3) {
          best.converged = true;  // rounding is all that is left
          return best;
        }
      }
    }
    damping *= 8;
  }
  return best;
}
template Solution<1> refine<1>(const WhiteBlocks&, const Shapes<1>&, const ShapeLimits&);
template Solution<2> refine<2>(const WhiteBlocks&, const Shapes<2>&, const ShapeLimits&);

template <int Modes>
Eigen::MatrixXd inverse_normal(const Equations<Modes>& at) {
  constexpr int n = Equations<Modes>::kAll;
  const Eigen::Matrix<double, n, 1> scale = at.normal.diagonal().cwiseSqrt();
  if (!(scale.array() > 0).all() || !scale.allFinite()) return {};
  const Eigen::Matrix<double, n, 1> inverse = scale.cwiseInverse();
  const Eigen::Matrix<double, n, n> scaled = inverse.asDiagonal() * at.normal * inverse.asDiagonal();
  const Eigen::LDLT<Eigen::Matrix<double, n, n>> solver(scaled);
  if (solver.info() != Eigen::Success || !(solver.vectorD().minCoeff() > 1e-13)) return {};
  const Eigen::Matrix<double, n, n> unit = solver.solve(Eigen::Matrix<double, n, n>::Identity());
  return inverse.asDiagonal() * unit * inverse.asDiagonal();
}
template Eigen::MatrixXd inverse_normal<1>(const Equations<1>&);
template Eigen::MatrixXd inverse_normal<2>(const Equations<2>&);

}  // namespace coilassay

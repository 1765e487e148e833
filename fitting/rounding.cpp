#include "fitting/rounding.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "fitting/damped_sine_equations.h"

namespace coilassay {
namespace {

constexpr std::size_t kTable = 2048;     // places per step
constexpr std::size_t kPlaces = 100000;  // looked at in a record
constexpr std::size_t kDraws = 21;       // a Fibonacci lattice: 21 points that fill a square evenly

// For one true signal the push is a constant, not a normal deviate. With its mean square widened by this, intervals
// cover 95 % not only over signals that differ in phase and offset but nearly for each of them (tests/proof).
constexpr double kShoulders = 1.3;

double normal_tail(double z) {
  return 0.5 * std::erfc(z / std::numbers::sqrt2);
}

double mean_error(double m, double noise) {
  if (noise < 0.15) {
    // Only the nearest thresholds are within reach.
    const double d = m - std::round(m);
    if (noise <= 0) return -d;
    return normal_tail((0.5 - d) / noise) - normal_tail((0.5 + d) / noise) - d;
  }
  double sum = 0;
  for (int k = 1; k <= 9; ++k) {
    const double weight = std::exp(-2 * std::pow(std::numbers::pi * k * noise, 2)) / (std::numbers::pi * k);
    sum += (k % 2 == 0 ? 1 : -1) * weight * std::sin(2 * std::numbers::pi * k * m);
  }
  return sum;
}

}  // namespace

MeanRounding::MeanRounding(double noise_in_steps) : value_(kTable + 1), integral_(kTable + 1) {
  // Half a place off the threshold, so that the jump of the noise-free sawtooth falls between two entries.
  for (std::size_t i = 0; i <= kTable; ++i) {
    value_[i] = mean_error((static_cast<double>(i) + 0.5) / kTable, noise_in_steps);
  }
  for (std::size_t i = 0; i < kTable; ++i) integral_[i + 1] = integral_[i] + value_[i] / kTable;
}

double MeanRounding::at(double level) const {
  return value_[static_cast<std::size_t>((level - std::floor(level)) * kTable)];
}

double MeanRounding::integral(double level) const {
  const double place = (level - std::floor(level)) * kTable;
  const auto i = static_cast<std::size_t>(place);
  return integral_[i] + value_[i] / kTable * (place - static_cast<double>(i));
}

double MeanRounding::mean(double from, double to) const {
  const double across = to - from;
  return std::abs(across) < 1e-3 ? at((from + to) / 2) : (integral(to) - integral(from)) / across;
}

bool rounding_matters(std::size_t samples, double resolution, double noise) {
  if (!std::isfinite(resolution) || resolution <= 0) return false;
  const double steps = noise / resolution;
  const double largest = std::exp(-2 * std::pow(std::numbers::pi * steps, 2)) / std::numbers::pi;
  return largest > 0.1 * std::hypot(steps, 0.29) / std::sqrt(static_cast<double>(samples));
}

RoundingError rounding_error(const DampedSine& model, std::size_t samples, double resolution, double noise,
                             const Eigen::MatrixXd& inverse) {
  const Shape shape{model.a, model.q};
  const MeanRounding rounding(noise / resolution);
  const double largest = std::max({std::abs(model.p), resolution, model.q > 0 ? model.envelope(0) : 0.0});
  struct Draw {
    double offset = 0, scale = 0, level = 0;
    Eigen::Matrix<double, 5, 1> push = Eigen::Matrix<double, 5, 1>::Zero();
  };
  std::array<Draw, kDraws> draws;
  for (std::size_t i = 0; i < kDraws; ++i) {
    const double first = (static_cast<double>(i) + 0.5) / kDraws;
    const double second = (static_cast<double>(13 * i % kDraws) + 0.5) / kDraws;
    draws[i].offset = model.c / resolution + first;
    draws[i].scale = (1 + (2 * second - 1) * resolution / largest) / resolution;
  }
  const std::size_t stride = std::max<std::size_t>(1, samples / kPlaces);
  const DampedPair step = damped_pair(shape, static_cast<double>(stride));
  DampedPair now;
  double squares = 0;
  const std::size_t places = samples / stride;
  for (std::size_t i = 0; i < places; ++i) {
    const double n = static_cast<double>(i * stride);
    if (i % 64 == 0) {
      now = damped_pair(shape, n);
    } else {
      now = {now.c * step.c - shape.q * now.s * step.s, now.c * step.s + now.s * step.c};
    }
    const double swing = model.p * now.c + model.s * now.s;
    Eigen::Matrix<double, 5, 1> slope;
    slope << -n * swing, -model.p * n * now.s / 2 + model.s * damped_sine_slope(shape, n, now), now.c, now.s, 1;
    for (Draw& draw : draws) {
      const double before = draw.level;
      draw.level = draw.offset + draw.scale * swing;
      const double d = stride == 1 || i == 0 ? rounding.at(draw.level) : rounding.mean(before, draw.level);
      draw.push += slope * d;
      squares += d * d;
    }
  }
  RoundingError error;
  error.mean_square = squares * resolution * resolution / static_cast<double>(places * kDraws);
  error.covariance = Eigen::MatrixXd::Zero(5, 5);
  for (const Draw& draw : draws) {
    const Eigen::VectorXd push = inverse * draw.push * (resolution * static_cast<double>(stride));
    error.covariance += kShoulders * push * push.transpose() / static_cast<double>(kDraws);
  }
  return error;
}

}  // namespace coilassay

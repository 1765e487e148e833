#include "fitting/damped_sine_noise.h"

#include <Eigen/Cholesky>
#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

namespace coilassay {
namespace {

// Sum of squared residuals over the samples of present blocks and the tail, sample by sample.
double squared_residuals(std::span<const double> y, const WhiteBlocks& blocks, const DampedSine& model) {
  constexpr std::size_t kChunk = 4096;
  std::array<double, kChunk> values;
  double sum = 0;
  const auto add = [&](std::size_t from, std::size_t to) {
    for (std::size_t at = from; at < to; at += kChunk) {
      const std::size_t n = std::min(kChunk, to - at);
      evaluate(model, static_cast<double>(at), std::span(values).first(n));
      for (std::size_t i = 0; i < n; ++i) {
        const double r = y[at + i] - values[i];
        if (std::isfinite(r)) sum += r * r;
      }
    }
  };
  std::size_t k = 0;
  while (k < blocks.count) {
    if (blocks.present[k] == 0) {
      ++k;
      continue;
    }
    std::size_t last = k;
    while (last < blocks.count && blocks.present[last] != 0) ++last;
    add(k * blocks.length, last * blocks.length);
    k = last;
  }
  if (blocks.tail_count > 0) add(blocks.length * blocks.count, y.size());
  return sum;
}

// e^x below -40 is nothing here.
double normal_tail(double z) { return 0.5 * std::erfc(z * 0.70710678118654752); }

// E[round(m + e)] - m in steps, for noise of `noise` steps (below about 0.5: two neighbours on each side matter).
double mean_rounding(double m, double noise) {
  const double d = m - std::round(m);
  if (noise <= 0) return -d;
  const double reach = 5 * noise;
  double up = 0;
  if (0.5 - d < reach) up += normal_tail((0.5 - d) / noise);
  if (0.5 + d < reach) up -= normal_tail((0.5 + d) / noise);
  if (1.5 - d < reach) up += normal_tail((1.5 - d) / noise);
  if (1.5 + d < reach) up -= normal_tail((1.5 + d) / noise);
  return up - d;
}

}  // namespace

NoiseJudgement judge_noise(std::span<const double> y, const WhiteBlocks& blocks, const Solution<1>& solution,
                           const DampedSine& model) {
  NoiseJudgement noise;
  const double values = static_cast<double>(blocks.values_used()), samples = static_cast<double>(blocks.samples());
  const double chi_square = solution.at.chi_square;
  const double band_dof = std::max(1.0, values - 5), sample_dof = std::max(1.0, samples - 5);
  noise.in_band = std::sqrt(chi_square / band_dof);
  // Outside the band of the blocks: all squares, less those in the band, less what the blocks cannot show of the model.
  const double total = blocks.square + blocks.tail_square;
  const double tail = static_cast<double>(blocks.tail_count);
  const double band = blocks.energy + (tail > 0 ? blocks.tail_sum * blocks.tail_sum / tail : 0);
  const double model_outside =
      model_square<1>(blocks, solution.shapes, solution.at.linear) - solution.at.model_energy;
  double squares = std::max(0.0, total - band - model_outside) + chi_square;
  // That difference leaves out the product of noise and model outside the band, and rounds: where either counts, every
  // sample is looked at.
  const double cross = 2 * std::sqrt(std::max(0.0, model_outside) * std::max(squares / samples, 1e-300));
  if (cross > 0.01 * squares || squares < 1e-9 * total) squares = squared_residuals(y, blocks, model);
  noise.per_sample = std::sqrt(squares / sample_dof);
  // In-band noise counts when it exceeds the other by more than chance (2.6 standard deviations: 1 in 200).
  const double excess = 1 + 2.6 * std::sqrt(2 / band_dof);
  const bool coloured = noise.in_band * noise.in_band > excess * noise.per_sample * noise.per_sample;
  noise.sigma = coloured ? noise.in_band : noise.per_sample;
  noise.dof = coloured ? band_dof : sample_dof;
  return noise;
}

double cubic_chi_square(const WhiteBlocks& blocks) {
  Eigen::Matrix4d normal = Eigen::Matrix4d::Zero();
  Eigen::Vector4d right = Eigen::Vector4d::Zero();
  const double middle = static_cast<double>(blocks.count - 1) / 2;
  for (std::size_t k = 0; k < blocks.count; ++k) {
    if (blocks.present[k] == 0) continue;
    const double t = (static_cast<double>(k) - middle) / (middle + 1);
    const Eigen::Vector4d powers(1, t, t * t, t * t * t);
    normal += powers * powers.transpose();
    right += powers * blocks.values[k];
  }
  return std::max(0.0, blocks.energy - right.dot(normal.ldlt().solve(right)));
}

Eigen::MatrixXd rounding_covariance(const DampedSine& model, std::size_t samples, double resolution, double noise,
                                    const Eigen::MatrixXd& inverse, double& mean_square) {
  // Offsets and amplitudes on a lattice that fills the square of one step by one step evenly.
  constexpr std::size_t kDraws = 21;
  const Shape shape{model.a, model.q};
  const double amplitude =
      model.q > 0 ? std::sqrt(model.p * model.p + model.s * model.s / model.q) : std::abs(model.p);
  struct Draw {
    double offset, scale;
    Eigen::Matrix<double, 5, 1> push = Eigen::Matrix<double, 5, 1>::Zero();
  };
  std::array<Draw, kDraws> draws;
  for (std::size_t i = 0; i < kDraws; ++i) {
    const double first = (static_cast<double>(i) + 0.5) / kDraws;
    const double second = (static_cast<double>(13 * i % kDraws) + 0.5) / kDraws;
    draws[i].offset = model.c / resolution + first;
    draws[i].scale = (1 + (second - 0.5) * 2 * resolution / std::max(amplitude, resolution)) / resolution;
  }
  const DampedPair step = damped_pair(shape, 1);
  DampedPair now;
  double squares = 0;
  for (std::size_t i = 0; i < samples; ++i) {
    const double n = static_cast<double>(i);
    if (i % 64 == 0) {
      now = damped_pair(shape, n);
    } else {
      now = {now.c * step.c - shape.q * now.s * step.s, now.c * step.s + now.s * step.c};
    }
    const double swing = model.p * now.c + model.s * now.s;
    Eigen::Matrix<double, 5, 1> slope;
    slope << -n * swing, -model.p * n * now.s / 2 + model.s * damped_sine_slope(shape, n, now), now.c, now.s, 1;
    for (Draw& draw : draws) {
      const double d = mean_rounding(draw.offset + draw.scale * swing, noise / resolution);
      draw.push += slope * d;
      squares += d * d;
    }
  }
  mean_square = squares * resolution * resolution / static_cast<double>(samples * kDraws);
  Eigen::MatrixXd covariance = Eigen::MatrixXd::Zero(5, 5);
  for (const Draw& draw : draws) {
    const Eigen::VectorXd push = inverse * draw.push * resolution;
    covariance += push * push.transpose() / static_cast<double>(kDraws);
  }
  return covariance;
}

}  // namespace coilassay

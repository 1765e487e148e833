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

// What of the white residuals is not rough: von Neumann's mean square successive difference sees only the noise.
double structured_part(const WhiteBlocks& blocks, const Solution<1>& solution) {
  const std::vector<double> residuals = white_residuals<1>(blocks, solution.shapes, solution.at.linear);
  const std::size_t rank = static_cast<std::size_t>(blocks.rank);
  double squares = 0, differences = 0;
  std::size_t pairs = 0, values = 0;
  for (std::size_t k = 0; k < blocks.count; ++k) {
    if (blocks.present[k] == 0) continue;
    const bool pair = k > 0 && blocks.present[k - 1] != 0;
    for (std::size_t i = k * rank; i < (k + 1) * rank; ++i) {
      squares += residuals[i] * residuals[i];
      if (pair) differences += (residuals[i] - residuals[i - rank]) * (residuals[i] - residuals[i - rank]);
    }
    values += rank;
    if (pair) pairs += rank;
  }
  if (pairs < 8) return 0;
  const double rough = differences / (2 * static_cast<double>(pairs));
  const double structure = squares - rough * static_cast<double>(values);
  // For white residuals the difference is chance with a relative standard deviation of about 1 / sqrt(pairs).
  return structure > 4 * squares / std::sqrt(static_cast<double>(pairs)) ? structure : 0;
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
  const double model_outside = model_square<1>(blocks, solution.shapes, solution.at.linear) - solution.at.model_energy;
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
  noise.structure = structured_part(blocks, solution);
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

}  // namespace coilassay

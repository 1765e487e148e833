#include <algorithm>
#include <cmath>
#include <numbers>

#include "fitting/roll_off_fit.h"

namespace coilassay {

namespace {

constexpr std::size_t kLeastLength = 8;   // a line takes two of them, the rest tell the noise

/// Sums of one block: y about its middle sample, against the index.
struct Line {
  double mean_x = 0, mean_y = 0, slope = 0, square = 0;   // square: sum of squares about the line
};

Line line_of(const double* x, const double* y, std::size_t n) {
  // Two streams of sums: the additions of one alone would wait for each other.
  const double reference = y[n / 2];
  const double middle = (static_cast<double>(n) - 1) / 2;
  double sx[2] = {0, 0}, sy[2] = {0, 0}, sny[2] = {0, 0}, syy[2] = {0, 0};
  for (std::size_t i = 0; i < n; ++i) {
    const double v = y[i] - reference;
    const std::size_t lane = i & 1;
    sx[lane] += x[i];
    sy[lane] += v;
    sny[lane] += (static_cast<double>(i) - middle) * v;
    syy[lane] += v * v;
  }
  const auto count = static_cast<double>(n);
  const double spread = count * (count * count - 1) / 12;
  const double total_y = sy[0] + sy[1], along = sny[0] + sny[1];
  Line line;
  line.mean_x = (sx[0] + sx[1]) / count;
  line.mean_y = reference + total_y / count;
  line.slope = along / spread;
  line.square = std::max(syy[0] + syy[1] - total_y * total_y / count - along * along / spread, 0.0);
  return line;
}

}  // namespace

RollOffBlocks roll_off_blocks(std::span<const double> x, std::span<const double> y, std::size_t first, std::size_t end,
                              std::size_t most, double resolution) {
  RollOffBlocks blocks;
  end = std::min({end, x.size(), y.size()});
  if (first + 3 * kLeastLength > end) return blocks;
  const std::size_t samples = end - first;
  // Whole blocks to the very end: that is where a coil saturates.
  blocks.length = std::max(kLeastLength, (samples + most - 1) / most);
  const std::size_t count = samples / blocks.length;
  first = end - count * blocks.length;
  blocks.x.reserve(count);
  blocks.y.reserve(count);
  double square = 0, run = 0;
  for (std::size_t b = 0; b < count; ++b) {
    const std::size_t at = first + b * blocks.length;
    const Line line = line_of(x.data() + at, y.data() + at, blocks.length);
    if (!std::isfinite(line.mean_x) || !std::isfinite(line.mean_y)) continue;
    blocks.first.push_back(at);
    blocks.x.push_back(line.mean_x);
    blocks.y.push_back(line.mean_y);
    square += line.square;
    run += std::fabs(line.slope);
  }
  const auto kept = static_cast<double>(blocks.x.size());
  const auto length = static_cast<double>(blocks.length);
  if (kept < 1) return blocks;
  blocks.dof = kept * (length - 2);
  blocks.sigma = std::sqrt(square / blocks.dof);
  blocks.sigma_of_mean = blocks.sigma / std::sqrt(length);
  if (resolution > 0) {
    // Rounding of a level errs by up to this much when noise of sigma dithers it; a block that sweeps several steps
    // averages it out, one that stays within a step does not.
    const double ratio = blocks.sigma / resolution;
    const double amplitude = std::min(0.5, std::exp(-2 * std::numbers::pi * std::numbers::pi * ratio * ratio)) * resolution;
    const double steps = std::max(1.0, run / kept * length / resolution);
    blocks.sigma_of_mean = std::hypot(blocks.sigma_of_mean, amplitude / std::sqrt(3.0) / steps);
    blocks.sigma_of_mean = std::max(blocks.sigma_of_mean, resolution / std::sqrt(12.0) / length);
  }
  return blocks;
}

}  // namespace coilassay

#include "fitting/damped_sine_start.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include "fitting/blocks.h"
#include "fitting/spectrum.h"

namespace coilassay {
namespace {

constexpr std::size_t kStretch = 1U << 14;   // values per transform
constexpr std::size_t kDeepest = 1U << 20;   // when nothing is seen otherwise
constexpr double kEnoughCycles = 24;         // a line above this bin is not the skirt of an offset
constexpr double kClear = 200;               // strength over floor that noise never reaches

// The line of values that are averages of `decimation` samples.
StrongestLine line_of(std::span<const double> values, std::size_t decimation) {
  const std::size_t n = values.size();
  double mean = 0;
  std::size_t present = 0;
  for (const double v : values) {
    if (!std::isfinite(v)) continue;
    mean += v;
    ++present;
  }
  StrongestLine line;
  const double d = static_cast<double>(decimation);
  line.length = n * decimation;
  if (present < 8) return line;
  mean /= static_cast<double>(present);
  // Padded to a power of two: the plan is kept, and the line is sampled more finely.
  std::size_t padded = 1;
  while (padded < n) padded *= 2;
  if (padded < kStretch) padded *= 2;
  std::vector<double> centred(padded);
  for (std::size_t i = 0; i < n; ++i) centred[i] = std::isfinite(values[i]) ? values[i] - mean : 0;
  const auto bins = fourier(centred);
  std::vector<double> power(bins.size());
  for (std::size_t k = 0; k < bins.size(); ++k) power[k] = std::norm(bins[k]);
  const auto first = static_cast<std::ptrdiff_t>(std::max<std::size_t>(1, padded / n / 2));
  const auto peak = std::max_element(power.begin() + first, power.end() - 1);
  if (*peak <= 0) return line;
  // Parabola through the logarithm of three bins.
  const double l = std::log(std::max(*(peak - 1), 1e-300)), m = std::log(*peak), r = std::log(std::max(*(peak + 1), 1e-300));
  const double bend = l - 2 * m + r;
  const double shift = bend < 0 ? std::clamp((l - r) / (2 * bend), -0.5, 0.5) : 0.0;
  const double bin = static_cast<double>(peak - power.begin()) + shift;
  const double step = 2 * std::numbers::pi / (static_cast<double>(padded) * d);
  line.omega = bin * step;
  line.omega_error = 0.3 * 2 * std::numbers::pi / (static_cast<double>(n) * d);
  line.cycles = line.omega * static_cast<double>(line.length) / (2 * std::numbers::pi);
  // Sums of samples are d times sums of averages; per sample of noise this is d per value.
  line.strength = *peak * d / static_cast<double>(n);
  std::nth_element(power.begin() + 1, power.begin() + static_cast<std::ptrdiff_t>(power.size() / 2), power.end());
  line.floor = power[power.size() / 2] * d / static_cast<double>(n);
  return line;
}

// Averages of four; a NaN makes its average NaN.
std::vector<double> averages(std::span<const double> y, std::size_t decimation, std::size_t from, std::size_t count) {
  const BlockSums sums = block_sums(y.subspan(from * decimation), decimation, count, 0, 0);
  std::vector<double> result(count);
  for (std::size_t i = 0; i < count; ++i) result[i] = sums.sum[i] / static_cast<double>(decimation);
  return result;
}

bool clear(const StrongestLine& line) { return line.strength > kClear * line.floor; }

}  // namespace

StrongestLine strongest_line(std::span<const double> y) {
  StrongestLine best;
  const auto consider = [&best](const StrongestLine& line) {
    if (line.strength > best.strength) best = line;
  };
  const std::size_t n = y.size();
  for (std::size_t length = 64; length < std::min(n, kStretch); length *= 4) consider(line_of(y.first(length), 1));
  StrongestLine last = line_of(y.first(std::min(n, kStretch)), 1);
  consider(last);
  std::vector<double> values(y.begin(), y.begin() + static_cast<std::ptrdiff_t>(std::min(n, kStretch)));
  // Longer stretches while what is seen is slow, or nothing is seen.
  for (std::size_t decimation = 4; n > kStretch * (decimation / 4) && !(clear(best) && best.cycles > kEnoughCycles);
       decimation *= 4) {
    const std::size_t count = std::min(kStretch, n / decimation);
    std::vector<double> next(count);
    const std::size_t known = std::min(count, values.size() / 4);
    for (std::size_t i = 0; i < known; ++i) {
      next[i] = (values[4 * i] + values[4 * i + 1] + values[4 * i + 2] + values[4 * i + 3]) / 4;
    }
    const std::vector<double> rest = averages(y, decimation, known, count - known);
    std::copy(rest.begin(), rest.end(), next.begin() + static_cast<std::ptrdiff_t>(known));
    values = std::move(next);
    consider(line_of(values, decimation));
  }
  if (!clear(best) && n > kStretch) {
    for (std::size_t length = 4 * kStretch; length / 4 < std::min(n, kDeepest); length *= 4) {
      consider(line_of(y.first(std::min(length, n)), 1));
    }
  }
  return best;
}

std::vector<Shape> starting_shapes(const StrongestLine& line) {
  const double length = static_cast<double>(line.length);
  std::vector<Shape> shapes;
  if (line.cycles >= kTrustedCycles) {
    for (const double decay : {0.1, 0.5, 1.26, 3.0, 8.0, 20.0}) {
      for (const double shift : {-0.5, 0.0, 0.5}) {
        const double omega = line.omega + shift * line.omega_error;
        shapes.push_back({decay / length, omega * omega});
      }
    }
    return shapes;
  }
  for (const double decay : {0.15, 0.5, 1.2, 2.5, 5.0, 10.0, 25.0}) {
    const double a = decay / length;
    const double step = 0.7 * std::max(a, std::numbers::pi / (8 * length));
    const double last = line.omega + 7 / length;
    for (double omega = std::max(0.0, line.omega - 7 / length); omega < last; omega += step) {
      shapes.push_back({a, omega * omega});
    }
    for (const double split : {0.5, 0.8, 0.95}) shapes.push_back({a, -a * a * split * split});
  }
  return shapes;
}

}  // namespace coilassay

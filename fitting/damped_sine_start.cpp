#include "fitting/damped_sine_start.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

#include "fitting/blocks.h"
#include "fitting/spectrum.h"

namespace coilassay {
namespace {

constexpr std::size_t kStretch = 1U << 12;  // values per transform
constexpr std::size_t kDeepest = 1U << 20;  // when nothing is seen otherwise
constexpr double kEnoughCycles = 24;        // a line above this bin is not the skirt of an offset
constexpr double kClear = 200;              // strength over floor that noise never reaches
constexpr double kNearlyAsGood = 0.6;       // of the greatest strength

// The line of values that are averages of `decimation` samples, by a transform of at least `padding` times their
// number.
StrongestLine line_by(std::span<const double> values, std::size_t decimation, std::size_t padding) {
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
  // Padded to a power of two: the plan is kept.
  std::size_t padded = 1;
  while (padded < n * padding) padded *= 2;
  std::vector<double> centred(padded);
  for (std::size_t i = 0; i < n; ++i) centred[i] = std::isfinite(values[i]) ? values[i] - mean : 0;
  const auto bins = fourier(centred);
  std::vector<double> power(bins.size());
  for (std::size_t k = 0; k < bins.size(); ++k) power[k] = std::norm(bins[k]);
  const auto first = static_cast<std::ptrdiff_t>(std::max<std::size_t>(1, padded / n / 2));
  const auto peak = std::max_element(power.begin() + first, power.end() - 1);
  if (*peak <= 0) return line;
  // Parabola through the logarithm of three bins.
  const double l = std::log(std::max(*(peak - 1), 1e-300)), m = std::log(*peak),
               r = std::log(std::max(*(peak + 1), 1e-300));
  const double bend = l - 2 * m + r;
  const double shift = bend < 0 ? std::clamp((l - r) / (2 * bend), -0.5, 0.5) : 0.0;
  const double bin = static_cast<double>(peak - power.begin()) + shift;
  const double step = 2 * std::numbers::pi / (static_cast<double>(padded) * d);
  line.omega = bin * step;
  line.omega_error = 0.3 * 2 * std::numbers::pi / (static_cast<double>(n) * d);
  line.cycles = line.omega * static_cast<double>(line.length) / (2 * std::numbers::pi);
  // Sums of samples are d times sums of averages; per sample of noise this is d per value.
  line.strength = *peak * d / static_cast<double>(present);
  // The median of some hundred bins is floor enough.
  const std::size_t skip = power.size() / 256 + 1;
  std::vector<double> some;
  for (std::size_t k = 1; k < power.size(); k += skip) some.push_back(power[k]);
  const auto middle = some.begin() + static_cast<std::ptrdiff_t>(some.size() / 2);
  std::nth_element(some.begin(), middle, some.end());
  line.floor = *middle * d / static_cast<double>(present);
  return line;
}

bool clear(const StrongestLine& line) {
  return line.strength > kClear * line.floor;
}

// A line between two bins loses up to 4 dB; only where it is not clear anyway the finer transform is worth its time.
StrongestLine line_of(std::span<const double> values, std::size_t decimation) {
  const StrongestLine line = line_by(values, decimation, 1);
  return clear(line) || values.size() > kStretch ? line : line_by(values, decimation, 2);
}

// Average of what is present; NaN when nothing is. For a start it does not matter that its place moves a little.
double present_average(std::span<const double> values) {
  const PresentSum present = present_sum(values, 0);
  return present.count > 0 ? present.sum / static_cast<double>(present.count) : std::nan("");
}

// Averages of `decimation` samples, and the squares of what they were made from.
struct Level {
  std::size_t decimation = 1;
  std::vector<double> average;  // of what is present
  std::vector<double> square;   // sum of (y - reference)^2; NaN where a sample is missing
};

// The level above: averages of four, then of the samples that follow them.
Level next_level(std::span<const double> y, double reference, const Level& below) {
  Level level{.decimation = below.decimation * 4, .average = {}, .square = {}};
  const std::size_t count = std::min(kStretch, y.size() / level.decimation);
  const std::size_t known = std::min(count, below.average.size() / 4);
  level.average.resize(count);
  level.square.resize(count);
  for (std::size_t i = 0; i < known; ++i) {
    const double* v = below.average.data() + 4 * i;
    const double* s = below.square.data() + 4 * i;
    level.average[i] = (v[0] + v[1] + v[2] + v[3]) / 4;
    level.square[i] = s[0] + s[1] + s[2] + s[3];
    if (!std::isfinite(level.average[i])) level.average[i] = present_average({v, 4});
  }
  const BlockSums rest = block_sums(y.subspan(known * level.decimation), level.decimation, count - known, 0, reference);
  for (std::size_t i = known; i < count; ++i) {
    level.average[i] = reference + rest.sum[i - known] / static_cast<double>(level.decimation);
    level.square[i] = rest.square[i - known];
    if (!std::isfinite(level.average[i])) {
      level.average[i] = present_average(y.subspan(i * level.decimation, level.decimation));
    }
  }
  return level;
}

}  // namespace

Beginning find_beginning(std::span<const double> y, double reference) {
  struct Look {
    StrongestLine line;
    std::size_t level = 0;
  };
  std::vector<Look> looks;
  std::vector<Level> levels;
  const std::size_t n = y.size();
  const auto strongest = [&looks] {
    Look best;
    for (const Look& look : looks) {
      if (look.line.strength > best.line.strength) best = look;
    }
    for (const Look& look : looks) {
      if (look.line.length > best.line.length && look.line.strength > kNearlyAsGood * best.line.strength) best = look;
    }
    return best;
  };
  for (std::size_t length = 64; length < std::min(n, kStretch); length *= 4) {
    looks.push_back({line_of(y.first(length), 1), 0});
  }
  looks.push_back({line_of(y.first(std::min(n, kStretch)), 1), 0});
  // Longer stretches while what is seen is slow, or nothing is seen.
  Look best = strongest();
  for (std::size_t decimation = 4; n > kStretch * (decimation / 4); decimation *= 4) {
    if (clear(best.line) && best.line.cycles > kEnoughCycles) break;
    if (levels.empty()) {
      Level samples;
      samples.average.assign(y.begin(), y.begin() + static_cast<std::ptrdiff_t>(kStretch));
      for (const double v : samples.average) samples.square.push_back((v - reference) * (v - reference));
      levels.push_back(next_level(y, reference, samples));
    } else {
      levels.push_back(next_level(y, reference, levels.back()));
    }
    looks.push_back({line_of(levels.back().average, decimation), levels.size()});
    best = strongest();
  }
  if (!clear(best.line) && n > kStretch) {
    for (std::size_t length = 4 * kStretch; length / 4 < std::min(n, kDeepest); length *= 4) {
      looks.push_back({line_of(y.first(std::min(length, n)), 1), 0});
    }
    best = strongest();
  }
  Beginning beginning{.line = best.line, .decimation = 1, .averages = {}, .sums = {}};
  if (!levels.empty()) {
    const Level& last = levels.back();
    ShortSums& sums = beginning.sums;
    sums.length = last.decimation;
    sums.reference = reference;
    sums.square = last.square;
    sums.sum.resize(last.average.size());
    for (std::size_t i = 0; i < sums.sum.size(); ++i) {
      sums.sum[i] = std::isfinite(last.square[i]) ? (last.average[i] - reference) * static_cast<double>(last.decimation)
                                                  : std::nan("");
    }
  }
  // One level further than the line was seen: four times as long, so that the offset is seen as well.
  const std::size_t level = best.level == 0 ? 0 : std::min(best.level + 1, levels.size());
  if (level > 0) {
    beginning.decimation = levels[level - 1].decimation;
    beginning.averages = std::move(levels[level - 1].average);
  }
  return beginning;
}

Beginning beginning_near(std::span<const double> y, double omega, double reference) {
  const std::size_t length = std::max<std::size_t>(1, y.size() / 512), count = y.size() / length;
  const BlockSums sums = block_sums(y, length, count, omega, reference);
  StrongestLine line;
  std::complex<double> sum = 0;
  std::size_t present = 0;
  for (std::size_t k = 0; k < count; ++k) {
    if (!std::isfinite(sums.sum[k])) continue;
    sum += sums.demodulated[k] * std::polar(1.0, -omega * static_cast<double>(k * length));
    present += length;
    const double strength = std::norm(sum) / static_cast<double>(present);
    if (present < 64 || strength < line.strength) continue;
    line.strength = strength;
    line.length = (k + 1) * length;
  }
  if (line.length == 0) line.length = y.size();
  line.omega = omega;
  line.omega_error = 0.3 * 2 * std::numbers::pi / static_cast<double>(line.length);
  line.cycles = omega * static_cast<double>(line.length) / (2 * std::numbers::pi);
  return {.line = line, .decimation = 1, .averages = {}, .sums = {}};
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
  // A line of two cycles or more is right to within a bin; a slower one may be the skirt of the offset.
  const bool some_cycles = line.cycles > 2;
  const double around = (some_cycles ? 4 : 7) / length;
  for (const double decay : {0.15, 0.5, 1.2, 2.5, 5.0, 10.0, 25.0}) {
    const double a = decay / length;
    const double step = 0.7 * std::max(a, std::numbers::pi / (8 * length));
    for (double omega = std::max(0.0, line.omega - around); omega < line.omega + around; omega += step) {
      shapes.push_back({a, omega * omega});
    }
    if (some_cycles) continue;
    for (const double split : {0.5, 0.8, 0.95}) shapes.push_back({a, -a * a * split * split});
  }
  return shapes;
}

}  // namespace coilassay

#include "analysis/describe_shapes.h"

#include <algorithm>
#include <cmath>
#include <vector>

namespace coilassay {

namespace {

constexpr std::size_t kBlocks = 256;
constexpr std::size_t kLeastRise = 8;     // blocks a ramp must last
constexpr std::size_t kFewReadings = 64;  // a list of readings, even when it has time stamps at even steps
constexpr std::size_t kMostReadings = 1000;

double root_mean_square(std::span<const double> samples) {
  double sum = 0, square = 0, count = 0;
  for (const double v : samples) {
    if (std::isnan(v)) continue;
    sum += v, ++count;
  }
  for (const double v : samples) {
    if (!std::isnan(v)) square += (v - sum / count) * (v - sum / count);
  }
  return count > 0 ? std::sqrt(square / count) : 0;
}

/// Averages over blocks of equal length; blocks without samples take the one before.
std::vector<double> block_means(const std::vector<double>& samples) {
  const std::size_t blocks = std::min(kBlocks, samples.size());
  std::vector<double> means;
  for (std::size_t b = 0; b < blocks; ++b) {
    const std::size_t first = samples.size() * b / blocks, end = samples.size() * (b + 1) / blocks;
    double sum = 0, count = 0;
    for (std::size_t i = first; i < end; ++i) {
      if (!std::isnan(samples[i])) sum += samples[i], ++count;
    }
    means.push_back(count > 0 ? sum / count : means.empty() ? 0 : means.back());
  }
  return means;
}

double median(std::vector<double> values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

struct Line {
  double slope = 0, correlation = 0;
};
Line line_through(const std::vector<double>& x, const std::vector<double>& y) {
  double n = 0, sx = 0, sy = 0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    if (std::isnan(x[i]) || std::isnan(y[i])) continue;
    ++n, sx += x[i], sy += y[i];
  }
  double xx = 0, yy = 0, xy = 0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    if (std::isnan(x[i]) || std::isnan(y[i])) continue;
    const double dx = x[i] - sx / n, dy = y[i] - sy / n;
    xx += dx * dx, yy += dy * dy, xy += dx * dy;
  }
  return xx > 0 && yy > 0 ? Line{xy / xx, xy / std::sqrt(xx * yy)} : Line{};
}

}  // namespace

bool is_level(std::span<const double> samples) {
  const std::size_t half = samples.size() / 2;
  const double begin = root_mean_square(samples.first(half)), end = root_mean_square(samples.last(half));
  return begin > 0 && std::fabs(end / begin - 1) < 0.2;
}

bool current_ramps(const Capture& capture, DrivenPair pair) {
  const std::vector<double> amps = block_means(capture.channels[pair.current].samples);
  const std::vector<double> volts = block_means(capture.channels[pair.voltage].samples);
  if (amps.size() < 2 * kLeastRise) return false;
  const auto peak =
      std::max_element(amps.begin(), amps.end(), [](double a, double b) { return std::fabs(a) < std::fabs(b); });
  const double sign = *peak < 0 ? -1 : 1, top = std::fabs(*peak);
  const auto last = static_cast<std::size_t>(peak - amps.begin());
  std::size_t first = last;
  while (first > 0 && sign * amps[first] > 0.05 * top) --first;
  if (sign * amps[first] > 0.3 * top || last - first < kLeastRise) return false;
  // Steady: hardly a step falls, and no single one is a jump; what rises like a sine flattens out before its peak.
  std::size_t falls = 0;
  double jump = 0;
  for (std::size_t i = first + 1; i <= last; ++i) {
    const double step = sign * (amps[i] - amps[i - 1]);
    falls += step < -0.005 * top ? 1 : 0;
    jump = std::max(jump, step);
  }
  const std::size_t quarter = (last - first) / 4;
  const double late = sign * (amps[last] - amps[last - quarter]);
  const double rise = sign * (amps[last] - amps[first]);
  const std::vector<double> under(volts.begin() + static_cast<std::ptrdiff_t>(first + 1),
                                  volts.begin() + static_cast<std::ptrdiff_t>(last));
  const double level = median(under);
  const auto steady = static_cast<std::size_t>(std::count_if(
      under.begin(), under.end(), [&](double v) { return v * level > 0 && std::fabs(v) > 0.4 * std::fabs(level); }));
  return falls * 20 <= last - first && jump < 0.4 * rise && late > 0.12 * rise && level != 0 &&
         steady * 10 >= under.size() * 9;
}

bool voltage_follows_current(const Capture& capture, DrivenPair pair) {
  const auto& amps = capture.channels[pair.current].samples;
  const auto& volts = capture.channels[pair.voltage].samples;
  if (amps.size() < 2 || amps.size() > kMostReadings) return false;
  const bool even = capture.time.uniform() && !std::isnan(capture.time.step_s);
  if (even && amps.size() > kFewReadings) return false;
  return std::fabs(line_through(amps, volts).correlation) > 0.99;
}

}  // namespace coilassay

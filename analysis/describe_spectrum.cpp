#include "analysis/describe_spectrum.h"

#include <algorithm>
#include <numbers>
#include <vector>

#include "fitting/spectrum.h"

namespace coilassay {

namespace {

constexpr std::size_t kLeast = 32;      // samples a spectrum needs
constexpr std::size_t kShortest = 512;  // stretches are not made shorter than this
constexpr std::size_t kLongest = 4096;
constexpr std::size_t kStretches = 8;
constexpr std::size_t kBands = 12;
constexpr std::size_t kLeastBand = 16;  // bins: a median of fewer scatters, and the quietest band is then too quiet
constexpr std::size_t kFirstBin = 5;    // the taper spreads what does not change over the bins below
constexpr double kAgrees = 2.5;         // times the low level: a band of 16 powers scatters by a third
constexpr double kNearNyquist = 0.8;

/// Four cosines, first derivative zero at the ends: side lobes of -93 dB that fall by 18 dB an octave. Nuttall's
/// family, IEEE Trans. ASSP 29 (1981), from memory; that it and its slope vanish at the ends is checked by the sums of
/// the coefficients.
constexpr double kTaper[] = {0.355768, 0.487396, 0.144232, 0.012604};

double mean_square_of_taper() {
  return kTaper[0] * kTaper[0] + (kTaper[1] * kTaper[1] + kTaper[2] * kTaper[2] + kTaper[3] * kTaper[3]) / 2;
}

/// The longest run without missing samples.
std::span<const double> longest_run(std::span<const double> samples) {
  std::span<const double> best;
  for (std::size_t i = 0; i < samples.size();) {
    std::size_t end = i;
    while (end < samples.size() && !std::isnan(samples[end])) ++end;
    if (end - i > best.size()) best = samples.subspan(i, end - i);
    i = end + 1;
  }
  return best;
}

/// Power of the samples less a straight line between the ends, tapered: no step where the transform joins them.
std::vector<double> tapered_power(std::span<const double> samples) {
  const auto n = static_cast<double>(samples.size());
  const double first = samples.front(), slope = (samples.back() - samples.front()) / (n - 1);
  std::vector<double> v(samples.size());
  for (std::size_t i = 0; i < v.size(); ++i) {
    const auto x = static_cast<double>(i);
    const double angle = 2 * std::numbers::pi * (x + 0.5) / n;
    const double taper =
        kTaper[0] - kTaper[1] * std::cos(angle) + kTaper[2] * std::cos(2 * angle) - kTaper[3] * std::cos(3 * angle);
    v[i] = (samples[i] - first - slope * x) * taper;
  }
  return power_spectrum(v);
}

/// The k-th smallest of m exponentially distributed powers is on average this many means (order statistics).
double mean_of_order(std::size_t k, std::size_t m) {
  double sum = 0;
  for (std::size_t j = m - k + 1; j <= m; ++j) sum += 1 / static_cast<double>(j);
  return sum;
}

/// Variance of white noise by the median power of each band, from low to high frequency.
std::vector<double> band_levels(std::span<const double> samples) {
  const std::vector<double> power = tapered_power(samples);
  // The last bin of an even length is real: another law.
  const std::size_t bins = power.size() - kFirstBin - 1;
  const std::size_t bands = std::clamp<std::size_t>(bins / kLeastBand, 1, kBands);
  const std::size_t width = bins / bands;
  const double scale = 1 / (static_cast<double>(samples.size()) * mean_square_of_taper());
  std::vector<double> levels;
  for (std::size_t b = 0; b < bands; ++b) {
    const auto from = power.begin() + static_cast<std::ptrdiff_t>(kFirstBin + b * width);
    std::vector<double> band(from, from + static_cast<std::ptrdiff_t>(width));
    const std::size_t middle = width / 2;
    std::nth_element(band.begin(), band.begin() + static_cast<std::ptrdiff_t>(middle), band.end());
    levels.push_back(band[middle] / mean_of_order(middle + 1, width) * scale);
  }
  return levels;
}

/// A low one of several, `share` from the lowest.
double low_one(std::vector<double> values, std::size_t share) {
  std::sort(values.begin(), values.end());
  return values[(values.size() - 1) / share];
}

/// Noise is the same everywhere, a signal is not: the quieter bands of the quieter stretches set the level, and all
/// that agree with it by chance are averaged, so that choosing low ones does not lower the result.
double noise_by_levels(const std::vector<std::vector<double>>& stretches) {
  std::vector<double> lows;
  for (const auto& levels : stretches) lows.push_back(low_one(levels, 3));
  const double low = low_one(lows, 4);
  double sum = 0, count = 0;
  for (const auto& levels : stretches) {
    for (const double level : levels) {
      if (level <= kAgrees * low) sum += level, ++count;
    }
  }
  return std::sqrt(sum / count);
}

struct Differences {
  double noise = 0;    // by the median of absolute third differences
  bool edges = false;  // some stand far beyond it: steps, not noise
};

Differences third_differences(std::span<const double> v) {
  std::vector<double> all;
  for (std::size_t i = 0; i + 3 < v.size(); ++i)
    all.push_back(std::fabs(v[i + 3] - 3 * v[i + 2] + 3 * v[i + 1] - v[i]));
  const double largest = *std::max_element(all.begin(), all.end());
  const auto middle = all.begin() + static_cast<std::ptrdiff_t>(all.size() / 2);
  std::nth_element(all.begin(), middle, all.end());
  constexpr double kSigmaOfMedian = 0.6745;
  const double scale = *middle / kSigmaOfMedian;
  return {.noise = scale / std::sqrt(20.0), .edges = largest > 8 * scale};
}

bool changes(std::span<const double> v) {
  return std::adjacent_find(v.begin(), v.end(), std::not_equal_to<>()) != v.end();
}

}  // namespace

double noise_of(std::span<const double> samples) {
  const std::size_t length = std::min(samples.size(), std::clamp(samples.size() / kStretches, kShortest, kLongest));
  if (length < kLeast) return std::nan("");
  const std::size_t count = std::min(kStretches, samples.size() / length);
  std::vector<std::vector<double>> free, with_edges;
  std::vector<double> differences;
  for (std::size_t i = 0; i < count; ++i) {
    const std::size_t first = count == 1 ? 0 : (samples.size() - length) / (count - 1) * i;
    const std::span<const double> run = longest_run(samples.subspan(first, length));
    if (run.size() < kLeast || !changes(run)) continue;
    const Differences d = third_differences(run);
    (d.edges ? with_edges : free).push_back(band_levels(run));
    if (d.noise > 0) differences.push_back(d.noise);
  }
  if (free.empty() && with_edges.empty()) return std::nan("");
  if (4 * free.size() >= count) return noise_by_levels(free);
  free.insert(free.end(), with_edges.begin(), with_edges.end());
  const double spectral = noise_by_levels(free);
  // Steps and nothing else: all that changes is signal.
  if (differences.empty()) return std::nan("");
  return std::min(spectral, low_one(std::move(differences), 4));
}

SpectralLine strongest_line(std::span<const double> samples) {
  SpectralLine line;
  const std::span<const double> run = longest_run(samples.last(std::min(samples.size(), 4 * kLongest)));
  if (run.size() < 2 * kLeast) return line;
  const std::vector<double> power = tapered_power(run);
  double total = 0, high = 0;
  std::size_t peak = 1;
  const auto near = static_cast<std::size_t>(kNearNyquist * static_cast<double>(power.size()));
  for (std::size_t k = 1; k < power.size(); ++k) {
    total += power[k];
    if (k >= near) high += power[k];
    if (power[k] > power[peak]) peak = k;
  }
  if (!(total > 0)) return line;
  double held = 0;
  for (std::size_t k = peak > 4 ? peak - 4 : 1; k <= std::min(peak + 4, power.size() - 1); ++k) held += power[k];
  line.cycles_per_sample = static_cast<double>(peak) / static_cast<double>(run.size());
  line.share = held / total;
  line.near_nyquist = high / total;
  return line;
}

}  // namespace coilassay

#include "acquire/table_resolution.h"

#include <algorithm>
#include <cmath>
#include <vector>

namespace coilassay {
namespace {

constexpr std::size_t kLookedAt = 32768;
constexpr std::size_t kFewestValues = 5;
constexpr double kMostCodes = 0x1p24;        // no converter of a waveform has more
constexpr double kMostWrittenCodes = 0x1p16;
/// Distance from the grid, in steps, that the rounding of text may cause. Values that lie on no grid come this near in a
/// tenth of the cases: five values by chance in 1e-5.
constexpr double kOff = 0.05;

std::vector<double> distinct_values(std::span<const double> samples) {
  std::vector<double> values;
  const std::size_t stride = std::max<std::size_t>(1, samples.size() / kLookedAt);
  values.reserve(samples.size() / stride + 1);
  for (std::size_t i = 0; i < samples.size(); i += stride) {
    if (std::isfinite(samples[i])) values.push_back(samples[i]);
  }
  std::sort(values.begin(), values.end());
  values.erase(std::unique(values.begin(), values.end()), values.end());
  return values;
}

struct Grid {
  double origin = 0;
  double step = 0;
  double distance(double value) const {  // in steps
    const double codes = (value - origin) / step;
    return std::fabs(codes - std::nearbyint(codes));
  }
};

/// Numbers the codes from the smallest value up, each from its neighbour, and draws the line through them.
Grid fitted_grid(const std::vector<double>& values, double step) {
  double code = 0;
  double n = 0;
  double mean_code = 0;
  double mean_value = 0;
  double moment = 0;
  double square = 0;
  double before = values.front();
  for (const double value : values) {
    code += std::max(1.0, std::nearbyint((value - before) / step));
    before = value;
    n += 1;
    const double off_code = code - mean_code;
    const double off_value = value - values.front() - mean_value;
    mean_code += off_code / n;
    mean_value += off_value / n;
    moment += off_code * (value - values.front() - mean_value);
    square += off_code * (code - mean_code);
  }
  const double slope = moment / square;
  return {values.front() + mean_value - slope * mean_code, slope};
}

bool all_near(const Grid& grid, std::span<const double> values) {
  return grid.step > 0 &&
         std::all_of(values.begin(), values.end(), [&grid](double v) { return !std::isfinite(v) || grid.distance(v) < kOff; });
}

/// Whether a step is a one in the decimal place where the values end.
bool is_last_digit(double step, std::span<const double> values) {
  const double power = std::pow(10.0, std::nearbyint(std::log10(step)));
  if (std::fabs(step / power - 1) > 1e-4) return false;
  return std::all_of(values.begin(), values.end(), [power](double v) {
    const double digits = v / power;
    return std::fabs(digits - std::nearbyint(digits)) < 1e-6 * std::max(1.0, std::fabs(digits)) + 1e-3;
  });
}

/// The fit is good to a few parts in 1e9 of nothing in particular: 0.04 rather than 0.040000000001.
double written_shortly(double step) {
  for (int digits = 0; digits < 7; ++digits) {
    const double power = std::pow(10.0, digits - std::floor(std::log10(step)));
    const double rounded = std::nearbyint(step * power) / power;
    if (std::fabs(rounded / step - 1) < 1e-7) return rounded;
  }
  return step;
}

}  // namespace

double find_resolution(std::span<const double> samples) {
  const std::vector<double> values = distinct_values(samples);
  if (values.size() < kFewestValues) return std::nan("");
  double gap = values.back() - values.front();
  for (std::size_t i = 1; i < values.size(); ++i) gap = std::min(gap, values[i] - values[i - 1]);
  for (int part = 1; part <= 6; ++part) {  // codes that happen not to occur next to each other
    const double step = gap / part;
    if ((values.back() - values.front()) / step > kMostCodes) break;
    const Grid grid = fitted_grid(values, step);
    if (std::fabs(grid.step / step - 1) > 0.2 || !all_near(grid, values)) continue;
    const double codes = (values.back() - values.front()) / grid.step;
    if (codes > kMostWrittenCodes && is_last_digit(grid.step, values)) return std::nan("");
    // Few values over many codes lie on some fine grid by chance.
    if (codes > 1000.0 * static_cast<double>(values.size())) return std::nan("");
    if (!all_near(grid, samples)) continue;  // codes between those looked at
    return written_shortly(grid.step);
  }
  return std::nan("");
}

}  // namespace coilassay

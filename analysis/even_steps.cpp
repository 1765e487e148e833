#include "analysis/even_steps.h"

#include <algorithm>
#include <cmath>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

/// Cubic through four points (Lagrange) at t; points need not be even.
double cubic_at(const std::vector<double>& t, const std::vector<double>& v, std::size_t first, double at) {
  double sum = 0;
  for (std::size_t i = first; i < first + 4; ++i) {
    double weight = 1;
    for (std::size_t j = first; j < first + 4; ++j) {
      if (i != j) weight *= (at - t[j]) / (t[i] - t[j]);
    }
    sum += weight * v[i];
  }
  return sum;
}

}  // namespace

Result<EvenRecord> on_even_steps(const Capture& capture, std::size_t channel) {
  EvenRecord record;
  if (capture.time.uniform()) {
    if (!(capture.time.step_s > 0)) {
      return failure(Problem::usage, capture.source.name, "the file does not say how far apart its samples are",
                     "export it with its time column, or with the sampling interval in its head");
    }
    record.step_s = capture.time.step_s;
    record.start_s = std::isnan(capture.time.start_s) ? 0 : capture.time.start_s;
    return record;
  }
  // Stamps that repeat or run backwards carry no new time; the first of each stands.
  std::vector<double> times, values;
  const std::vector<double>& v = capture.channels[channel].samples;
  for (std::size_t i = 0; i < capture.time.times_s.size() && i < v.size(); ++i) {
    const double t = capture.time.times_s[i];
    if (std::isnan(t) || std::isnan(v[i])) continue;
    if (!times.empty() && !(t > times.back())) continue;
    times.push_back(t);
    values.push_back(v[i]);
  }
  if (times.size() < 16) {
    return failure(Problem::too_few_samples, capture.source.name,
                   "only " + std::to_string(times.size()) + " samples have a time of their own", "check the time column");
  }
  std::vector<double> steps;
  for (std::size_t i = 1; i < times.size(); ++i) steps.push_back(times[i] - times[i - 1]);
  record.step_s = median(steps);
  record.start_s = times.front();
  const auto count = static_cast<std::size_t>((times.back() - times.front()) / record.step_s) + 1;
  if (count > 64 * times.size()) {
    return failure(Problem::usage, capture.source.name, "the time steps differ too much to be evened out",
                   "export the record on even steps");
  }
  record.samples.reserve(count);
  std::size_t after = 0;
  for (std::size_t i = 0; i < count; ++i) {
    const double at = record.start_s + static_cast<double>(i) * record.step_s;
    while (after < times.size() && times[after] < at) ++after;
    const std::size_t first = std::min(after >= 2 ? after - 2 : 0, times.size() - 4);
    record.samples.push_back(cubic_at(times, values, first, at));
  }
  const auto [least, most] = std::minmax_element(steps.begin(), steps.end());
  const double ratio = *most / std::max(*least, 1e-300);
  record.findings.push_back({"uneven_step", Severity::note,
                             "the time steps are uneven; the record was resampled at its median step by a cubic through "
                             "neighbouring samples",
                             capture.channels[channel].name, ratio, Unit::one});
  return record;
}

}  // namespace coilassay

#include "analysis/capture_checks.h"

#include <algorithm>
#include <cmath>
#include <span>

#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/extremes.h"

namespace coilassay {

namespace {

constexpr double kFewCodes = 32;       // below: quantisation is a main error of the shape, caution
constexpr double kModestCodes = 64;    // below: worth knowing
constexpr double kSmallShare = 0.25;   // of the range

/// Noise of neighbouring samples by the median of absolute second differences, robust against the signal's own shape.
double sample_noise(const std::vector<double>& v, std::size_t first, std::size_t end) {
  std::vector<double> second;
  const std::size_t stride = (end - first) / 4096 + 1;
  for (std::size_t i = first + 1; i + 1 < end; i += stride) {
    const double d = v[i - 1] - 2 * v[i] + v[i + 1];
    if (!std::isnan(d)) second.push_back(std::fabs(d));
  }
  if (second.empty()) return 0;
  const auto middle = second.begin() + static_cast<std::ptrdiff_t>(second.size() / 2);
  std::nth_element(second.begin(), middle, second.end());
  return *middle / 0.6745 / std::sqrt(6.0);
}

/// How far the crest of a natural wave would stand above a flat run, judged by a parabola through its flanks.
double hidden_crest(const std::vector<double>& v, std::size_t first, std::size_t end, std::size_t run_first,
                    std::size_t run_end) {
  const double half = static_cast<double>(run_end - run_first) / 2;
  const auto reach = static_cast<std::size_t>(std::max(1.0, half));
  double hidden = INFINITY;
  const double extreme = v[run_first];
  bool any = false;
  if (run_first >= first + reach && !std::isnan(v[run_first - reach])) {
    hidden = std::min(hidden, std::fabs(extreme - v[run_first - reach]));
    any = true;
  }
  if (run_end + reach <= end && !std::isnan(v[run_end + reach - 1])) {
    hidden = std::min(hidden, std::fabs(extreme - v[run_end + reach - 1]));
    any = true;
  }
  if (!any) return 0;
  const double outer = half + static_cast<double>(reach);
  return hidden * half * half / (outer * outer - half * half);
}

}  // namespace

std::vector<FlatTop> find_flat_tops(const Channel& channel, std::size_t first, std::size_t end) {
  std::vector<FlatTop> tops;
  const std::vector<double>& v = channel.samples;
  end = std::min(end, v.size());
  if (first + 8 > end) return tops;
  const auto [low, high] = extremes(std::span<const double>(v).subspan(first, end - first));
  if (!(high > low)) return tops;
  const double code = std::isnan(channel.resolution) ? 0 : channel.resolution;
  const double noise = sample_noise(v, first, end);
  const double tolerance = 3 * std::max(code, noise);
  for (std::size_t i = first; i < end;) {
    if (v[i] != high && v[i] != low) {
      ++i;
      continue;
    }
    std::size_t run = i + 1;
    while (run < end && v[run] == v[i]) ++run;
    if (run - i >= 3) {
      // Within a step of the stated full scale, and on the side where the converter ends.
      const bool at_scale =
          !std::isnan(channel.full_scale) && code > 0 && std::fabs(v[i]) >= channel.full_scale - 1.01 * code;
      if (at_scale || hidden_crest(v, first, end, i, run) > tolerance) tops.push_back({i, run});
    }
    i = run;
  }
  return tops;
}

std::vector<Finding> check_range(const Channel& channel, std::size_t first, std::size_t end) {
  std::vector<Finding> findings;
  if (std::isnan(channel.resolution) || !(channel.resolution > 0)) return findings;
  end = std::min(end, channel.samples.size());
  if (first >= end) return findings;
  const auto [low, high] = extremes(std::span<const double>(channel.samples).subspan(first, end - first));
  if (!(high > low)) return findings;
  const double codes = (high - low) / channel.resolution;
  const double share = std::isnan(channel.full_scale) ? 1 : (high - low) / (2 * channel.full_scale);
  if (codes >= kModestCodes && share >= kSmallShare) return findings;
  std::string message = shown(channel.name) + " spans only " + to_text(codes, Unit::one, Script::utf8, 3) +
                        " codes of its converter";
  if (share < kSmallShare) {
    message += " (" + to_percent_text(share) + " of its range): a range " +
               to_text(1 / share, Unit::one, Script::utf8, 2) + " times finer would show more";
  } else {
    message += ": a finer range or averaging would show more";
  }
  // A fine converter used in a small corner still resolves the wave: worth knowing, no doubt about the value.
  const Severity severity = codes < kFewCodes ? Severity::caution : Severity::note;
  findings.push_back({"coarse_range", severity, message, channel.name, share < 1 ? share : codes, Unit::one});
  return findings;
}

}  // namespace coilassay

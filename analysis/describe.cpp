#include "analysis/describe.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/capture_checks.h"
#include "analysis/decay_window.h"
#include "analysis/even_steps.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/spectrum.h"

namespace coilassay {

namespace {

constexpr std::size_t kSpectrumLength = 16384;
constexpr std::size_t kBands = 12;
constexpr double kNearNyquist = 0.8;      // of half the sampling rate

/// The largest stretch without missing samples among a few, at most kSpectrumLength long, from the end of the record:
/// there a transient has calmed down.
std::vector<double> stretch_for_noise(std::span<const double> samples) {
  const std::size_t length = std::min(samples.size(), kSpectrumLength);
  std::vector<double> best;
  std::vector<double> run;
  for (const double v : samples.last(length)) {
    if (std::isnan(v)) {
      if (run.size() > best.size()) best = run;
      run.clear();
    } else {
      run.push_back(v);
    }
  }
  return run.size() > best.size() ? run : best;
}

/// Hann window times samples less a straight line between the ends: no step where the transform joins them.
std::vector<double> tapered_power(std::vector<double> v) {
  const auto n = static_cast<double>(v.size());
  const double first = v.front(), slope = (v.back() - v.front()) / (n - 1);
  for (std::size_t i = 0; i < v.size(); ++i) {
    const auto x = static_cast<double>(i);
    const double taper = 0.5 - 0.5 * std::cos(2 * std::numbers::pi * (x + 0.5) / n);
    v[i] = (v[i] - first - slope * x) * taper;
  }
  return power_spectrum(v);
}

/// Strong energy close to half the sampling rate: what is above it folds back unseen.
bool rises_towards_nyquist(const std::vector<double>& power) {
  if (power.size() < 64) return false;
  const std::size_t first = static_cast<std::size_t>(kNearNyquist * static_cast<double>(power.size()));
  double high = 0, total = 0;
  for (std::size_t k = 2; k < power.size(); ++k) {
    total += power[k];
    if (k >= first) high += power[k];
  }
  return total > 0 && high > 0.6 * total;
}

std::size_t clipped_samples(const Channel& channel) {
  // A level held for more than a twentieth of the record is a state of the circuit, not a crest cut off.
  const std::size_t longest = std::max<std::size_t>(channel.samples.size() / 20, 3);
  std::size_t count = 0;
  for (const FlatTop& top : find_flat_tops(channel, 0, channel.samples.size())) {
    if (top.end - top.first <= longest) count += top.end - top.first;
  }
  return count;
}

ChannelDescription describe_channel(const Channel& channel, std::vector<Finding>& findings) {
  ChannelDescription d;
  d.name = channel.name;
  d.unit = channel.unit;
  d.missing = channel.missing;
  d.resolution = channel.resolution;
  d.first = d.last = d.min = d.max = std::nan("");
  for (const double v : channel.samples) {
    if (std::isnan(v)) continue;
    if (std::isnan(d.first)) d.first = v;
    d.last = v;
    d.min = std::fmin(d.min, v);
    d.max = std::fmax(d.max, v);
  }
  d.noise = noise_of(channel.samples);
  const double span = d.max - d.min;
  const double code = std::isnan(channel.resolution) ? 0 : channel.resolution;
  const double floor = std::hypot(std::isnan(d.noise) ? 0 : d.noise, code / std::sqrt(12.0));
  if (span > 0 && floor > 0) d.effective_bits = std::log2(span / (std::sqrt(12.0) * floor));
  if (!std::isnan(channel.full_scale)) d.range_used = span / (2 * channel.full_scale);
  d.clipped = clipped_samples(channel);
  if (d.clipped > 0) {
    findings.push_back({"clipped", Severity::caution,
                        std::to_string(d.clipped) + " samples of " + shown(channel.name) +
                            " stand at a flat top: the range was too small",
                        channel.name, static_cast<double>(d.clipped), Unit::one});
  }
  for (Finding& finding : check_range(channel, 0, channel.samples.size())) findings.push_back(std::move(finding));
  const std::vector<double> stretch = stretch_for_noise(channel.samples);
  if (stretch.size() >= 128 && span > 20 * (std::isnan(d.noise) ? 0 : d.noise)) {
    const std::vector<double> power = tapered_power(stretch);
    if (rises_towards_nyquist(power)) {
      findings.push_back({"aliased", Severity::caution,
                          "most of what moves in " + shown(channel.name) +
                              " lies close to half the sampling rate: the record may be thinned out or sampled too slowly",
                          channel.name, kNearNyquist, Unit::one});
    }
  }
  return d;
}

std::string quoted(const std::string& name) {
  const std::string safe = shown(name);
  return safe.find_first_of(" '\"()&;|<>*?$`\\#") == std::string::npos ? safe : "'" + safe + "'";
}

/// A channel that decays while it swings.
bool rings(const Capture& capture, std::size_t channel) {
  const auto record = on_even_steps(capture, channel);
  if (!record) return false;
  const std::span<const double> samples =
      record->samples.empty() ? std::span<const double>(capture.channels[channel].samples) : record->samples;
  DecaySearch search;
  search.resolution = record->samples.empty() ? capture.channels[channel].resolution : std::nan("");
  const auto decay = find_decay(samples, search);
  if (!decay || !(decay->fit.model.q > 0)) return false;
  const double length = static_cast<double>(decay->end - decay->first);
  const double cycles = decay->fit.model.damped_omega() * length / (2 * std::numbers::pi);
  return decay->fit.model.a * length > 0.3 && cycles > 0.8 && decay->fit.model.quality() > 0.5;
}

Suggestion suggest(const Capture& capture) {
  for (std::size_t i = 0; i < capture.channels.size(); ++i) {
    if (capture.channels[i].unit != Unit::volt && capture.channels[i].unit_stated) continue;
    if (!rings(capture, i)) continue;
    Suggestion suggestion{"ringdown", "coilassay ringdown " + quoted(capture.source.name)};
    if (capture.channels.size() > 1) suggestion.command += " --voltage " + quoted(capture.channels[i].name);
    suggestion.command += " --capacitor 10nF±1%";
    return suggestion;
  }
  return {};
}

}  // namespace

double noise_of(std::span<const double> samples) {
  const std::vector<double> stretch = stretch_for_noise(samples);
  if (stretch.size() < 32) return std::nan("");
  const std::vector<double> power = tapered_power(stretch);
  // The median over the exponential law of a noise power is ln 2 times its mean; the quietest band but one of several.
  std::vector<double> medians;
  const std::size_t width = std::max<std::size_t>((power.size() - 2) / kBands, 4);
  for (std::size_t first = 2; first + width <= power.size(); first += width) {
    std::vector<double> band(power.begin() + static_cast<std::ptrdiff_t>(first),
                             power.begin() + static_cast<std::ptrdiff_t>(first + width));
    std::nth_element(band.begin(), band.begin() + static_cast<std::ptrdiff_t>(width / 2), band.end());
    medians.push_back(band[width / 2]);
  }
  if (medians.size() < 2) return std::nan("");
  std::sort(medians.begin(), medians.end());
  const double mean_power = medians[1] / std::numbers::ln2;
  const double taper_square = 3.0 / 8.0;  // mean square of the Hann window
  return std::sqrt(mean_power / (static_cast<double>(stretch.size()) * taper_square));
}

Description describe(const Recording& recording) {
  Description d;
  if (const auto* sweep = std::get_if<Sweep>(&recording)) {
    d.kind = "sweep";
    d.source = sweep->source;
    d.dialect = sweep->dialect;
    d.findings = sweep->findings;
    d.samples = sweep->frequency_hz.size();
    if (!sweep->frequency_hz.empty()) {
      const auto [low, high] = std::minmax_element(sweep->frequency_hz.begin(), sweep->frequency_hz.end());
      d.frequency_first_hz = *low;
      d.frequency_last_hz = *high;
    }
    d.parameter = sweep->as_read;
    d.ports = sweep->ports;
    d.reference_ohm = sweep->reference_ohm;
    return d;
  }
  const auto& captures = std::get<std::vector<Capture>>(recording);
  d.kind = "waveform";
  if (captures.empty()) return d;
  const Capture& first = captures.front();
  d.source = first.source;
  d.dialect = first.dialect;
  d.start_s = first.time.uniform() ? first.time.start_s : first.time.times_s.front();
  d.sample_interval_s = first.time.step_s;
  d.uniform = first.time.uniform();
  d.findings = first.findings;
  for (const Channel& channel : first.channels) d.channels.push_back(describe_channel(channel, d.findings));
  for (const Capture& capture : captures) {
    d.samples += capture.samples();
    d.segments.push_back({capture.segment, capture.samples(),
                          capture.time.uniform() ? capture.time.start_s : capture.time.times_s.front()});
  }
  d.suggestion = suggest(first);
  return d;
}

}  // namespace coilassay

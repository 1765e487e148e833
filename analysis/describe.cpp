#include "analysis/describe.h"

#include <algorithm>
#include <cmath>
#include <span>

#include "analysis/capture_checks.h"
#include "analysis/describe_spectrum.h"
#include "analysis/describe_suggestion.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

constexpr double kFewCycles = 3;      // as in ring_down_decay.cpp
constexpr double kThinlySampled = 5;  // samples a period
constexpr double kHardlySampled = 2.2;
constexpr double kMostlyHigh = 0.6;  // of the power, above 0.8 of half the sampling rate
// Of the span: what is smaller may be side lobes of a swing of computed numbers; no converter is that quiet.
constexpr double kQuietest = 1e-7;
constexpr double kMostlyRounding = 1.2;  // noise up to here is rounding with less than 0.2 steps of its own
constexpr double kEvenSteps = 1e-3;      // of a step: how far steps of several records may differ
constexpr double kEvenStamps = 0.1;      // of a step: how far a rounded stamp may be off

std::string figure_text(double figure) {
  return to_text(figure, Unit::one, Script::utf8, 2);
}

/// The level next to a flat top is far away within an eighth of the top's length: a switch, not a crest.
bool is_jump(const Channel& channel, const FlatTop& top, double span) {
  const std::size_t reach = std::max<std::size_t>((top.end - top.first) / 8, 1);
  const double level = channel.samples[top.first];
  const auto left = [&](std::size_t i) { return std::fabs(channel.samples[i] - level) > span / 2; };
  return (top.first >= reach && left(top.first - reach)) ||
         (top.end + reach <= channel.samples.size() && left(top.end + reach - 1));
}

std::size_t clipped_samples(const Channel& channel, double span) {
  const std::size_t all = channel.samples.size();
  std::size_t count = 0;
  for (const FlatTop& top : find_flat_tops(channel, 0, all)) {
    const std::size_t length = top.end - top.first;
    const bool at_scale = !std::isnan(channel.full_scale) && !std::isnan(channel.resolution) &&
                          std::fabs(channel.samples[top.first]) >= channel.full_scale - 1.01 * channel.resolution;
    // A level held for long is a state of the circuit if the record begins or ends in it or something switched it.
    const bool held = length > std::max<std::size_t>(all / 20, 3) &&
                      (top.first == 0 || top.end == all || is_jump(channel, top, span));
    if (at_scale || !held) count += length;
  }
  return count;
}

/// Adds one record's channel to what is known of it from the records before.
void add_samples(ChannelDescription& d, const Channel& channel) {
  for (const double v : channel.samples) {
    if (std::isnan(v)) continue;
    if (std::isnan(d.first)) d.first = v;
    d.last = v;
    d.min = std::fmin(d.min, v);
    d.max = std::fmax(d.max, v);
  }
  d.missing += channel.missing;
  if (std::isnan(d.resolution) || channel.resolution < d.resolution) d.resolution = channel.resolution;
}

ChannelDescription channel_over(const std::vector<Capture>& captures, std::size_t index) {
  const Channel& shape = captures.front().channels[index];
  ChannelDescription d;
  d.name = shape.name;
  d.unit = shape.unit;
  d.unit_stated = shape.unit_stated;
  d.column = shape.column;
  for (const Capture& capture : captures) {
    if (index >= capture.channels.size()) continue;
    const Channel& channel = capture.channels[index];
    add_samples(d, channel);
    d.clipped += clipped_samples(channel, d.max - d.min);
  }
  const double span = d.max - d.min;
  d.noise = noise_of(shape.samples);
  if (!(d.noise > kQuietest * span)) d.noise = std::nan("");
  const double rounding = d.resolution / std::sqrt(12.0);
  if (span > 0 && rounding > 0) {
    d.noise_is_rounding = !(d.noise > kMostlyRounding * rounding);
    d.noise = std::fmax(d.noise, rounding);
  }
  if (span > 0 && d.noise > 0) d.effective_bits = std::log2(span / (std::sqrt(12.0) * d.noise));
  if (!std::isnan(shape.full_scale)) d.range_used = span / (2 * shape.full_scale);
  return d;
}

void check_channel(const Channel& channel, const ChannelDescription& d, std::vector<Finding>& findings) {
  const std::string who = channel.name.empty() ? "column " + std::to_string(channel.column) : shown(channel.name, 60);
  if (d.clipped > 0) {
    findings.push_back(
        {"clipped", Severity::caution,
         std::to_string(d.clipped) + " samples of " + who + " stand at a flat top: the range was too small",
         channel.name, static_cast<double>(d.clipped), Unit::one});
  }
  for (Finding& finding : check_range(channel, 0, channel.samples.size())) findings.push_back(std::move(finding));
  const SpectralLine line = strongest_line(channel.samples);
  const bool moves = std::isnan(d.noise) || d.max - d.min > 20 * d.noise;
  if (moves && line.near_nyquist > kMostlyHigh) {
    findings.push_back(
        {"aliased", Severity::caution,
         "most of what moves in " + who +
             " lies close to half the sampling rate: the record may be thinned out or sampled too slowly",
         channel.name, 1 / line.cycles_per_sample, Unit::one});
  }
}

void check_swing(const Capture& capture, const Swing& swing, std::vector<Finding>& findings) {
  const std::string& about = capture.channels[swing.channel].name;
  if (swing.cycles < kFewCycles) {
    findings.push_back({"few_cycles", Severity::note,
                        std::string(swing.decays ? "the decay" : "the record") + " holds " + figure_text(swing.cycles) +
                            " periods: a longer record would tell the frequency better",
                        about, swing.cycles, Unit::one});
  }
  const bool said = std::any_of(findings.begin(), findings.end(),
                                [&](const Finding& f) { return f.code == "aliased" && f.about == about; });
  if (swing.samples_per_period < kThinlySampled && !said) {
    findings.push_back({"aliased", swing.samples_per_period < kHardlySampled ? Severity::caution : Severity::note,
                        "only " + figure_text(swing.samples_per_period) +
                            " samples a period: the true frequency may be above half the sampling rate; capture faster "
                            "to be sure",
                        about, swing.samples_per_period, Unit::one});
  }
}

/// The step between the distinct times of an axis on which every stamp occurs twice (peak detection); NaN for any other
/// uneven axis.
double step_of_pairs(const std::vector<double>& times) {
  std::vector<double> distinct;
  for (const double t : times) {
    if (distinct.empty() || t != distinct.back()) distinct.push_back(t);
  }
  if (distinct.size() < 2 || (times.size() + 1) / 2 != distinct.size()) return std::nan("");
  const double step = (distinct.back() - distinct.front()) / static_cast<double>(distinct.size() - 1);
  for (std::size_t i = 0; i < distinct.size(); ++i) {
    const double off = distinct[i] - distinct.front() - static_cast<double>(i) * step;
    if (!(std::fabs(off) < kEvenStamps * step)) return std::nan("");
  }
  return step;
}

double step_of(const TimeAxis& time) {
  return time.uniform() ? time.step_s : step_of_pairs(time.times_s);
}
double start_of(const TimeAxis& time) {
  return time.uniform() ? time.start_s : time.times_s.front();
}

void describe_time(const std::vector<Capture>& captures, Description& d) {
  const Capture& first = captures.front();
  d.start_s = start_of(first.time);
  d.sample_interval_s = step_of(first.time);
  for (const Capture& capture : captures) {
    d.samples += capture.samples();
    d.segments.push_back({capture.segment, capture.samples(), start_of(capture.time)});
    const double step = step_of(capture.time);
    d.uniform = d.uniform && (capture.time.uniform() || !std::isnan(step)) &&
                !(std::fabs(step - d.sample_interval_s) > kEvenSteps * d.sample_interval_s);
  }
  if (!d.uniform) d.sample_interval_s = std::nan("");
  if (first.samples() < 2) return;
  d.span_s = first.time.uniform() ? first.time.step_s * static_cast<double>(first.samples() - 1)
                                  : first.time.times_s.back() - first.time.times_s.front();
}

/// What every record of a file says again is said once, by the largest figure; missing samples are counted in each.
void add_findings(const std::vector<Finding>& more, std::vector<Finding>& findings) {
  for (const Finding& finding : more) {
    const auto said = std::find_if(findings.begin(), findings.end(), [&](const Finding& f) {
      return f.code == finding.code && f.about == finding.about && f.code != "missing_samples";
    });
    if (said == findings.end()) {
      findings.push_back(finding);
    } else if (finding.figure > said->figure) {
      *said = finding;
    }
  }
}

Description describe_sweep(const Sweep& sweep, const DescribeOptions& options) {
  Description d;
  d.kind = "sweep";
  d.source = sweep.source;
  d.dialect = sweep.dialect;
  d.findings = sweep.findings;
  d.samples = sweep.frequency_hz.size();
  if (!sweep.frequency_hz.empty()) {
    d.frequency_first_hz = sweep.frequency_hz.front();
    d.frequency_last_hz = sweep.frequency_hz.back();
  }
  d.parameter = sweep.as_read;
  d.ports = sweep.ports;
  d.reference_ohm = sweep.reference_ohm;
  d.bad_points = static_cast<std::size_t>(std::count(sweep.bad.begin(), sweep.bad.end(), true));
  d.suggestion = likely_test(sweep, options);
  return d;
}

Description describe_captures(const std::vector<Capture>& captures, const DescribeOptions& options) {
  Description d;
  d.kind = "waveform";
  if (captures.empty()) return d;
  const Capture& first = captures.front();
  d.source = first.source;
  d.dialect = first.dialect;
  describe_time(captures, d);
  for (const Capture& capture : captures) add_findings(capture.findings, d.findings);
  for (std::size_t i = 0; i < first.channels.size(); ++i) {
    d.channels.push_back(channel_over(captures, i));
    check_channel(first.channels[i], d.channels.back(), d.findings);
  }
  const Likeness likeness = likely_test(first, options);
  d.suggestion = likeness.suggestion;
  if (likeness.swing) check_swing(first, *likeness.swing, d.findings);
  return d;
}

}  // namespace

Description describe(const Recording& recording, const DescribeOptions& options) {
  if (const auto* sweep = std::get_if<Sweep>(&recording)) return describe_sweep(*sweep, options);
  return describe_captures(std::get<std::vector<Capture>>(recording), options);
}

}  // namespace coilassay

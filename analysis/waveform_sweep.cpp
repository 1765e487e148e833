#include "analysis/waveform_sweep.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <utility>

#include "analysis/waveform_parts.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr std::size_t kFewestSamples = 256;
constexpr std::size_t kFewestPoints = 5;

std::string text(double value, Unit unit, int digits = 3) { return to_text(value, unit, Script::utf8, digits); }

void refuse(WaveformSweep& result, std::string code, std::string why, std::string about, double figure = 0) {
  result.findings.push_back({std::move(code), Severity::refusal, std::move(why), std::move(about), figure, Unit::one});
}

/// Samples inside [from, to].
std::pair<std::size_t, std::size_t> window_of(const DrivenRecord& record, const WaveformRequest& request) {
  const auto count = static_cast<double>(record.volts.size());
  const double first = request.from_s ? std::ceil((*request.from_s - record.start_s) / record.step_s - 1e-6) : 0;
  const double end = request.to_s ? std::floor((*request.to_s - record.start_s) / record.step_s + 1e-6) + 1 : count;
  const double low = std::clamp(first, 0.0, count);
  return {static_cast<std::size_t>(low), static_cast<std::size_t>(std::clamp(end, low, count))};
}

/// Samples at the end of the converter's range: what went beyond is lost, and with it every frequency.
std::size_t clipped_samples(const Channel& channel) {
  if (!(channel.full_scale > 0)) return 0;
  const double step = channel.resolution > 0 ? channel.resolution : 0;
  const double top = channel.full_scale - 1.01 * step;
  const double bottom = -channel.full_scale + 0.01 * step;
  return static_cast<std::size_t>(std::count_if(channel.samples.begin(), channel.samples.end(),
                                                [&](double s) { return s >= top || s <= bottom; }));
}

bool missing(const std::vector<double>& samples) {
  return std::any_of(samples.begin(), samples.end(), [](double s) { return std::isnan(s); });
}

/// One error of the bench as a change of all points, by what the measured ratio is multiplied with at x + u and at x.
template <class Factor>
void add_error(WaveformSweep& result, const InputError& error, const Factor& factor) {
  const double u = error.law.standard_uncertainty;
  if (!(u > 0)) return;
  ImpedanceErrorTerm term{error.source, error.law, error.kind, error.common, error.basis, {}};
  term.law.standard_uncertainty = 1;
  const Sweep& sweep = *result.sweep;
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    const double omega = 2 * std::numbers::pi * sweep.frequency_hz[i];
    term.dz_ohm.push_back(sweep.z_ohm[i][0] * (factor(omega, error.value + u) / factor(omega, error.value) - 1.0));
  }
  result.knowledge.errors.push_back(std::move(term));
}

/// The points as a sweep: the current's chain taken out, the bench's errors as terms.
void finish(WaveformSweep& result, RatioPoints points, const DrivenRecord& about) {
  result.findings.insert(result.findings.end(), points.findings.begin(), points.findings.end());
  result.segment = points.segment;
  result.averages = points.averages;
  if (points.frequency_hz.size() < kFewestPoints) {
    const bool said = std::any_of(points.findings.begin(), points.findings.end(),
                                  [](const Finding& f) { return f.severity == Severity::refusal; });
    if (!said) {
      refuse(result, "no_signal",
             "voltage and current have too little in common: at " + std::to_string(points.frequency_hz.size()) +
                 " frequencies both stand out of the noise; use a stronger burst, finer ranges or a longer record",
             about.volt_name, static_cast<double>(points.frequency_hz.size()));
    }
    return;
  }
  const auto chain = [&](double omega, double skew, double tau, double corner) { return current_chain(omega, skew, tau, corner); };
  Sweep sweep;
  sweep.frequency_hz = std::move(points.frequency_hz);
  sweep.as_read = "Z";
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    const double omega = 2 * std::numbers::pi * sweep.frequency_hz[i];
    sweep.z_ohm.push_back({points.ratio[i] * chain(omega, about.skew_s, about.shunt_tau_s, about.probe_corner_hz)});
    sweep.bad.push_back(false);
  }
  result.low_hz = sweep.frequency_hz.front();
  result.high_hz = sweep.frequency_hz.back();
  result.sweep = std::move(sweep);
  result.knowledge.u_ratio = std::move(points.u);
  result.knowledge.complete = true;
  result.knowledge.corrections = about.corrections;
  for (RatioPoints::Shared& shared : points.shared) {
    ImpedanceErrorTerm term{shared.source, {shared.law, 1, 0}, 'A', false, shared.basis, std::move(shared.relative)};
    for (std::size_t i = 0; i < term.dz_ohm.size(); ++i) term.dz_ohm[i] *= result.sweep->z_ohm[i][0];
    result.knowledge.errors.push_back(std::move(term));
  }
  const DrivenRecord::Errors& e = about.errors;
  const bool shunt = e.current_gain.source.starts_with("shunt");
  add_error(result, e.voltage_gain, [](double, double x) { return Complex(x); });
  add_error(result, e.current_gain, [shunt](double, double x) { return Complex(shunt ? x : 1 / x); });
  add_error(result, e.skew, [&](double w, double x) { return chain(w, x, 0, 0); });
  add_error(result, e.shunt_tau, [&](double w, double x) { return chain(w, 0, x, 0); });
  add_error(result, e.probe_corner, [&](double w, double x) { return chain(w, 0, 0, x); });
}

void tell_band(WaveformSweep& result) {
  const bool whole = result.method == "whole record";
  const auto points = static_cast<double>(result.sweep->frequency_hz.size());
  result.findings.push_back(
      {"excitation_band", Severity::note,
       "the burst carries energy from " + text(result.low_hz, Unit::hertz) + " to " + text(result.high_hz, Unit::hertz) + ": " +
           std::to_string(result.sweep->frequency_hz.size()) + " frequencies, " +
           (whole ? "from the whole record, which begins and ends at rest"
                  : "from segments of " + std::to_string(result.segment) + " samples, worth " +
                        text(result.averages, Unit::one, 2) + " averages"),
       "sweep", points, Unit::one});
}

}  // namespace

Result<WaveformSweep> sweep_of_waveforms(std::span<const Capture> captures, const WaveformRequest& request) {
  WaveformSweep result;
  std::optional<DrivenRecord> about;
  std::vector<WaveformPair> records;
  bool volts_rest = true, amps_rest = true, complete = true;
  for (const Capture& capture : captures) {
    Result<DrivenRecord> record = driven_record(capture, request.bench, request.propagation);
    if (!record) return failure(record);
    const auto [first, end] = window_of(*record, request);
    const auto part = [first = first, end = end](const std::vector<double>& v) {
      return std::vector<double>(v.begin() + static_cast<std::ptrdiff_t>(first), v.begin() + static_cast<std::ptrdiff_t>(end));
    };
    WaveformPair pair{part(record->volts), part(record->amps)};
    result.sources.push_back({capture.source, record->volts.size(), record->step_s});
    if (about && (pair.volts.size() != records.front().volts.size() || std::fabs(record->step_s / about->step_s - 1) > 1e-6)) {
      return failure(Problem::usage, capture.source.name, "its length or its sample interval is not that of the first capture",
                     "capture all bursts with the same settings, or measure them one by one");
    }
    if (!about) result.findings = record->findings;
    for (const std::size_t column : {record->columns.voltage, record->columns.current}) {
      const std::size_t clipped = clipped_samples(capture.channels[column]);
      if (clipped < 3) continue;
      refuse(result, "clipped",
             std::to_string(clipped) + " samples of " + shown(capture.channels[column].name, 40) +
                 " are at the end of the range: what went beyond is missing at every frequency; use a coarser range",
             capture.channels[column].name, static_cast<double>(clipped));
    }
    complete = complete && !missing(pair.volts) && !missing(pair.amps);
    if (complete) {
      volts_rest = volts_rest && look_at_ends(pair.volts, record->volt_resolution).quiet;
      amps_rest = amps_rest && look_at_ends(pair.amps, record->amp_resolution).quiet;
    }
    records.push_back(std::move(pair));
    if (!about) about = std::move(*record);
  }
  if (!about) return failure(Problem::usage, "sweep", "no capture was given", "name the file of the burst");
  if (std::any_of(result.findings.begin(), result.findings.end(), [](const Finding& f) { return f.code == "clipped" && f.severity == Severity::refusal; })) {
    return result;
  }
  if (records.front().volts.size() < kFewestSamples) {
    refuse(result, "too_few_samples",
           "the window holds " + std::to_string(records.front().volts.size()) + " samples, and a burst needs at least " +
               std::to_string(kFewestSamples),
           about->volt_name, static_cast<double>(records.front().volts.size()));
    return result;
  }
  if (complete && volts_rest != amps_rest) {
    refuse(result, "burst_cut",
           volts_rest ? "the voltage begins and ends at rest, and the current does not: the coil is not discharged at the end of the record; make it "
                        "longer, or let a resistance discharge the coil"
                      : "the current begins and ends at rest, and the voltage does not: capture the burst whole, with a quiet stretch before and after",
           volts_rest ? about->amp_name : about->volt_name);
    return result;
  }
  const bool whole = volts_rest && amps_rest && complete;
  result.method = whole ? "whole record" : "averaged segments";
  finish(result, whole ? ratio_of_whole(records, about->step_s, *about) : ratio_of_segments(records, about->step_s, *about), *about);
  if (result.sweep) {
    result.sweep->source = captures.front().source;
    tell_band(result);
  }
  return result;
}

}  // namespace coilassay

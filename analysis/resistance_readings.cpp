#include "analysis/resistance_readings.h"

#include <algorithm>
#include <cmath>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

namespace defaults = resistance_defaults;

/// Step of the last written digit of all values: an instrument that shows the same number again and again hides its scatter
/// behind it. Zeros at the end are lost in reading: "1.000" has become 1, so four digits are taken as shown at least. NaN for
/// numbers with more digits than an instrument has.
double written_step(const std::vector<double>& values) {
  constexpr int kFewestDigits = 4, kMostDigits = 9;
  double largest = 0;
  for (const double v : values) {
    if (std::isfinite(v)) largest = std::fmax(largest, std::fabs(v));
  }
  if (!(largest > 0)) return std::nan("");
  const int first = static_cast<int>(std::floor(std::log10(largest)));
  for (int place = first + 1 - kFewestDigits; place > first - kMostDigits; --place) {
    const double scale = std::pow(10.0, -place);
    const bool all = std::all_of(values.begin(), values.end(), [scale](double v) {
      return !std::isfinite(v) || std::fabs(v * scale - std::nearbyint(v * scale)) < 1e-6;
    });
    if (all) return 1 / scale;
  }
  return std::nan("");
}

double step_of(const Channel& channel) {
  return std::isfinite(channel.resolution) ? channel.resolution : written_step(channel.samples);
}

/// What a meter of the hand is good for, in place of a scope's gain that nobody stated.
void take_meter_default(InputError& gain, double ratio, const PropagationOptions& options) {
  if (options.exact_bench || !gain.basis.starts_with("default")) return;
  gain.law = {ErrorLaw::Kind::rectangular, ratio / std::sqrt(3.0), 0};
  gain.basis = "default: ±" + to_percent_text(ratio) + ", a hand-held meter";
}

bool is_scope(const Capture& capture) {
  const TimeAxis& time = capture.time;
  double step = time.step_s;
  if (!time.uniform() && time.times_s.size() > 1) {
    step = (time.times_s.back() - time.times_s.front()) / static_cast<double>(time.times_s.size() - 1);
  }
  return step < defaults::kScopeStep_s;
}

/// When readings were taken, counted from the first; empty when the file does not say.
std::vector<double> times_of(const Capture& capture) {
  std::vector<double> times;
  if (capture.time.uniform()) {
    if (!std::isfinite(capture.time.step_s)) return times;
    for (std::size_t i = 0; i < capture.samples(); ++i) times.push_back(static_cast<double>(i) * capture.time.step_s);
    return times;
  }
  for (const double t : capture.time.times_s) times.push_back(t - capture.time.times_s.front());
  return times;
}

/// Time decides nothing here but the order: the channels are taken as they stand.
Result<DrivenRecord> scaled(const Capture& capture, const ResistanceRequest& request) {
  Capture counted = capture;
  counted.time = {0, 1, {}};
  BenchSetup bench = request.bench;
  bench.current.skew.reset();
  bench.current.shunt_inductance.reset();
  std::erase_if(counted.findings, [](const Finding& f) { return f.code == "uneven_step"; });
  return driven_record(counted, bench, request.propagation);
}

}  // namespace

Result<ResistanceReadings> readings_of(const std::vector<Capture>& captures, const ResistanceRequest& request) {
  ResistanceReadings readings;
  if (request.bench.current.probe_corner) {
    return failure(Problem::usage, "current probe", "a probe with a low corner frequency does not show direct current",
                   "use a shunt, a meter or a probe that goes down to direct current");
  }
  for (const Capture& capture : captures) {
    Result<DrivenRecord> record = scaled(capture, request);
    if (!record) return failure(record);
    const bool first = &capture == &captures.front();
    const std::vector<double> times = captures.size() == 1 ? times_of(capture) : std::vector<double>();
    readings.timed = !times.empty();
    readings.from_scope = readings.from_scope || is_scope(capture);
    const std::size_t before = readings.order.empty() ? 0 : static_cast<std::size_t>(readings.order.back());
    for (std::size_t i = 0; i < record->volts.size(); ++i) {
      if (!std::isfinite(record->volts[i]) || !std::isfinite(record->amps[i])) continue;
      readings.volts.push_back(record->volts[i]);
      readings.amps.push_back(record->amps[i]);
      readings.order.push_back(readings.timed ? times[i] : static_cast<double>(before + i + 1));
    }
    const ChannelSetup& current = request.bench.current;
    const double volt_factor = request.bench.voltage.gain ? std::fabs(request.bench.voltage.gain->value) : 1;
    const double amp_factor = std::fabs((current.gain ? current.gain->value : 1) / (current.shunt ? current.shunt->value : 1));
    const double volt_step = volt_factor * step_of(capture.channels[record->columns.voltage]);
    const double amp_step = amp_factor * step_of(capture.channels[record->columns.current]);
    readings.volt_step = std::fmax(readings.volt_step, volt_step);  // fmax leaves out what is not known
    readings.amp_step = std::fmax(readings.amp_step, amp_step);
    for (Finding& finding : record->findings) {
      if (captures.size() > 1) finding.message = shown(capture.source.name, 60) + ": " + finding.message;
      readings.findings.push_back(std::move(finding));
    }
    if (!first) continue;
    readings.voltage_gain = record->errors.voltage_gain;
    readings.current_gain = record->errors.current_gain;
    readings.corrections = record->corrections;
  }
  if (!readings.from_scope) {
    take_meter_default(readings.voltage_gain, defaults::kMeterVoltageRatio, request.propagation);
    if (!request.bench.current.shunt) {
      take_meter_default(readings.current_gain, defaults::kMeterCurrentRatio, request.propagation);
    }
  }
  return readings;
}

}  // namespace coilassay

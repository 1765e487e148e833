#include "analysis/driven_capture.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <utility>

#include "analysis/even_steps.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

namespace defaults = driven_defaults;

/// Does the bench say that the current column holds volts?
bool current_in_volts(const ChannelSetup& current) {
  return current.shunt || (current.gain && current.gain->unit == Unit::ampere_per_volt);
}

bool may_be_volts(const Channel& channel) {
  return channel.unit == Unit::volt || !channel.unit_stated;
}

tl::unexpected<Error> no_current(const Capture& capture, std::optional<std::size_t> candidate) {
  if (candidate) {
    const std::string name = shown(capture.channels[*candidate].name, 40);
    return failure(Problem::usage, capture.source.name, "no column is in A, and it is not said what '" + name + "' means",
                   "say how the current was taken: --current " + name + " --shunt 0.1ohm, or --current-gain 10A/V");
  }
  return failure(Problem::missing_column, capture.source.name, "the file has no second column for the current",
                 "capture voltage and current together");
}

/// The two columns and what is subtracted from them.
Result<DrivenRecord::Columns> choose_columns(const Capture& capture, const BenchSetup& bench) {
  DrivenRecord::Columns columns;
  std::vector<std::size_t> taken;
  const auto is_taken = [&](std::size_t i) { return std::find(taken.begin(), taken.end(), i) != taken.end(); };
  const auto named = [&](const std::optional<std::string>& column, const char* option,
                         std::optional<std::size_t>& place) -> Result<void> {
    if (!column) return {};
    const Result<std::size_t> found = find_channel(capture, *column, option);
    if (!found) return failure(found);
    place = *found;
    taken.push_back(*found);
    return {};
  };
  std::optional<std::size_t> voltage, current;
  if (auto fine = named(bench.voltage.column, "--voltage", voltage); !fine) return failure(fine);
  if (auto fine = named(bench.current.column, "--current", current); !fine) return failure(fine);
  if (auto fine = named(bench.voltage.low_column, "--voltage-low", columns.voltage_low); !fine) return failure(fine);
  if (auto fine = named(bench.current.low_column, "--current-low", columns.current_low); !fine) return failure(fine);

  const auto first = [&](const auto& suits) -> std::optional<std::size_t> {
    for (std::size_t i = 0; i < capture.channels.size(); ++i) {
      if (!is_taken(i) && suits(capture.channels[i])) return i;
    }
    return std::nullopt;
  };
  if (!voltage) {
    voltage = first([](const Channel& c) { return c.unit == Unit::volt; });
    if (!voltage) voltage = first([](const Channel& c) { return !c.unit_stated; });
    if (!voltage) {
      return failure(Problem::missing_column, capture.source.name, "no column is in V",
                     "name the voltage column with --voltage");
    }
    taken.push_back(*voltage);
  }
  if (!current) {
    if (current_in_volts(bench.current)) {
      current = first(may_be_volts);
    } else {
      current = first([](const Channel& c) { return c.unit == Unit::ampere; });
      if (!current && bench.current.gain) current = first([](const Channel& c) { return !c.unit_stated; });
    }
    if (!current) return no_current(capture, first(may_be_volts));
  }
  if (*voltage == *current) {
    return failure(Problem::usage, "--current", "voltage and current are the same column",
                   "name two columns of the file");
  }
  columns.voltage = *voltage;
  columns.current = *current;
  return columns;
}

Result<void> check_current_unit(const Capture& capture, const Channel& channel, const ChannelSetup& current) {
  const std::string name = shown(channel.name, 40);
  const bool volts = current_in_volts(current);
  if (volts && channel.unit_stated && channel.unit == Unit::ampere) {
    return failure(Problem::usage, capture.source.name,
                   "column '" + name + "' is already in A, and a " + (current.shunt ? "shunt" : "gain in A/V") +
                       " was stated for it",
                   current.shunt ? "leave out --shunt, or name the column that holds the shunt's voltage"
                                 : "leave out --current-gain, or name the column that holds the probe's voltage");
  }
  if (!volts && channel.unit != Unit::ampere && !(current.gain && !channel.unit_stated)) {
    return failure(Problem::usage, capture.source.name,
                   channel.unit_stated ? "column '" + name + "' is in " + std::string(symbol(channel.unit)) +
                                             ", and it is not said what current that means"
                                       : "the file does not say the unit of column '" + name + "'",
                   "give --shunt 0.1ohm or --current-gain 10A/V (or --current-gain 1 for a column in A)");
  }
  if (current.shunt_inductance && !current.shunt) {
    return failure(Problem::usage, "--shunt-inductance", "no shunt is given that could have it",
                   "give the shunt with --shunt 0.1ohm±1%");
  }
  if (current.shunt && current.gain && current.gain->unit == Unit::ampere_per_volt) {
    return failure(Problem::usage, "--current-gain", "a shunt and a gain in A/V: the column cannot be both",
                   "leave out the shunt, or give the gain as a plain number");
  }
  return {};
}

/// A tolerance of a factor as an error around 1.
InputError ratio_error(std::string source, const StatedValue& factor, double otherwise, const PropagationOptions& options) {
  InputError input = input_error(std::move(source), factor,
                                 {otherwise * std::fabs(factor.value), "±" + to_percent_text(otherwise)}, options);
  input.law.standard_uncertainty /= std::fabs(factor.value);
  input.value = 1;
  return input;
}

/// Two independent factors of one channel as one.
InputError both(InputError a, const InputError& b) {
  if (!(b.law.standard_uncertainty > 0)) return a;
  if (!(a.law.standard_uncertainty > 0)) {
    a.law = b.law;
    a.basis = b.basis;
    return a;
  }
  a.law = {ErrorLaw::Kind::normal, std::hypot(a.law.standard_uncertainty, b.law.standard_uncertainty), 0};
  if (a.basis != b.basis) a.basis += ", " + b.basis;
  return a;
}

InputError timebase_error(const BenchSetup& bench, const PropagationOptions& options) {
  if (!bench.timebase) {
    return input_error("time base", StatedValue::unstated(0, Unit::one),
                       {defaults::kTimebaseRatio, "±100 ppm, a poor crystal"}, options);
  }
  // A stated time base is a tolerance around no error: "25 ppm" is the half-width.
  InputError input = input_error("time base", *bench.timebase, {}, options);
  const double half = bench.timebase->law == Law::unstated ? bench.timebase->value : 0;
  input.value = 0;
  input.basis = "stated";
  if (half > 0) input.law = {ErrorLaw::Kind::rectangular, half / std::sqrt(3.0), 0};
  return input;
}

/// Factors of both channels, best values and errors.
struct Factors {
  double volts = 1, amps = 1;
};

Factors take_factors(const BenchSetup& bench, const PropagationOptions& options, DrivenRecord& record) {
  Factors factors;
  const StatedValue one = StatedValue::unstated(1, Unit::one);
  record.errors.voltage_gain =
      ratio_error("voltage gain", bench.voltage.gain.value_or(one), defaults::kVoltageGainRatio, options);
  if (bench.voltage.gain) {
    factors.volts = bench.voltage.gain->value;
    record.corrections.push_back({"voltage gain", factors.volts, Unit::one});
  }

  const ChannelSetup& current = bench.current;
  if (current.shunt) {
    factors.amps = 1 / current.shunt->value;
    record.errors.current_gain = ratio_error("shunt", *current.shunt, defaults::kShuntRatio, options);
    record.corrections.push_back({"shunt", current.shunt->value, Unit::ohm});
    if (current.gain) {
      factors.amps *= current.gain->value;
      record.errors.current_gain =
          both(record.errors.current_gain,
               ratio_error("current gain", *current.gain, defaults::kCurrentGainRatio, options));
      record.errors.current_gain.source = "shunt and current gain";
      record.corrections.push_back({"current gain", current.gain->value, Unit::one});
    }
  } else {
    record.errors.current_gain =
        ratio_error("current gain", current.gain.value_or(one), defaults::kCurrentGainRatio, options);
    if (current.gain) {
      factors.amps = current.gain->value;
      record.corrections.push_back({"current gain", factors.amps, current.gain->unit});
    }
  }
  return factors;
}

/// Skew, shunt inductance and probe corner: values kept aside, with their errors.
void take_timing(const BenchSetup& bench, const PropagationOptions& options, DrivenRecord& record) {
  const ChannelSetup& current = bench.current;
  const StatedValue no_skew = StatedValue::unstated(0, Unit::second);
  record.errors.skew = input_error("skew", current.skew.value_or(no_skew),
                                   {defaults::kSkew_s, current.skew ? "±2 ns" : "not stated, up to 2 ns either way"},
                                   options);
  record.skew_s = record.errors.skew.value;
  if (record.skew_s != 0) record.corrections.push_back({"skew", record.skew_s, Unit::second});

  record.errors.shunt_tau.source = "shunt inductance";
  if (current.shunt) {
    const double ohm = current.shunt->value;
    InputError& tau = record.errors.shunt_tau;
    if (current.shunt_inductance) {
      tau = input_error("shunt inductance", *current.shunt_inductance,
                        {defaults::kStatedInductanceRatio * current.shunt_inductance->value, "±50 %"}, options);
      record.corrections.push_back({"shunt inductance", current.shunt_inductance->value, Unit::henry});
    } else {
      tau = input_error("shunt inductance", StatedValue::unstated(0, Unit::henry),
                        {defaults::kShuntInductance_h, "not stated, up to 5 nH"}, options);
    }
    tau.value /= ohm;
    tau.law.standard_uncertainty /= ohm;
    record.shunt_tau_s = tau.value;
  }

  record.errors.probe_corner.source = "current probe corner";
  if (current.probe_corner) {
    record.errors.probe_corner =
        input_error("current probe corner", *current.probe_corner,
                    {defaults::kStatedCornerRatio * current.probe_corner->value, "±20 %"}, options);
    record.probe_corner_hz = record.errors.probe_corner.value;
    record.corrections.push_back({"current probe corner", record.probe_corner_hz, Unit::hertz});
  }
  record.errors.timebase = timebase_error(bench, options);
}

/// Uneven times: a sample that one of the columns misses is left out of all, so that they are resampled alike.
Capture missing_together(const Capture& capture, const std::vector<std::size_t>& used) {
  Capture together;
  together.source = capture.source;
  together.time = capture.time;
  for (const std::size_t c : used) together.channels.push_back(capture.channels[c]);
  for (std::size_t i = 0; i < together.samples(); ++i) {
    const bool missing = std::any_of(together.channels.begin(), together.channels.end(),
                                     [i](const Channel& c) { return std::isnan(c.samples[i]); });
    if (!missing) continue;
    for (Channel& channel : together.channels) channel.samples[i] = std::nan("");
  }
  return together;
}

/// Step that rounding of a difference of two quantised columns is worth: its variance is the sum of both.
double step_of_difference(double a, double b) {
  return std::hypot(a, b);
}

Result<void> take_samples(const Capture& capture, const Factors& factors, DrivenRecord& record) {
  std::vector<std::size_t> used{record.columns.voltage, record.columns.current};
  const auto slot = [&](std::optional<std::size_t> column) {
    if (!column) return used.size();  // not used
    used.push_back(*column);
    return used.size() - 1;
  };
  const std::size_t voltage_low = slot(record.columns.voltage_low);
  const std::size_t current_low = slot(record.columns.current_low);

  const bool even = capture.time.uniform();
  std::vector<std::vector<double>> resampled(used.size());
  const Capture together = even ? Capture{} : missing_together(capture, used);
  for (std::size_t i = 0; i < (even ? 1 : used.size()); ++i) {
    Result<EvenRecord> steps = even ? on_even_steps(capture, used[i]) : on_even_steps(together, i);
    if (!steps) return failure(steps);
    record.start_s = steps->start_s;
    record.step_s = steps->step_s;
    resampled[i] = std::move(steps->samples);
    for (Finding& finding : steps->findings) {
      const bool known = std::any_of(record.findings.begin(), record.findings.end(),
                                     [&](const Finding& other) { return other.code == finding.code; });
      if (!known) record.findings.push_back(std::move(finding));
    }
  }
  const auto scaled = [&](std::size_t high, std::size_t low, double factor, double& resolution) {
    const auto samples = [&](std::size_t s) -> const std::vector<double>& {
      return even ? capture.channels[used[s]].samples : resampled[s];
    };
    std::vector<double> out = samples(high);
    resolution = even ? capture.channels[used[high]].resolution : std::nan("");
    if (low < used.size()) {
      const std::vector<double>& subtracted = samples(low);
      for (std::size_t i = 0; i < out.size(); ++i) out[i] -= subtracted[i];
      resolution = step_of_difference(resolution, even ? capture.channels[used[low]].resolution : std::nan(""));
    }
    if (factor != 1) {
      for (double& v : out) v *= factor;
    }
    resolution *= std::fabs(factor);
    return out;
  };
  record.volts = scaled(0, voltage_low, factors.volts, record.volt_resolution);
  record.amps = scaled(1, current_low, factors.amps, record.amp_resolution);
  return {};
}

}  // namespace

Result<DrivenRecord> driven_record(const Capture& capture, const BenchSetup& bench, const PropagationOptions& options) {
  const Result<DrivenRecord::Columns> columns = choose_columns(capture, bench);
  if (!columns) return failure(columns);
  DrivenRecord record;
  record.columns = *columns;
  const Channel& voltage = capture.channels[columns->voltage];
  const Channel& current = capture.channels[columns->current];
  if (voltage.unit_stated && voltage.unit != Unit::volt) {
    return failure(Problem::usage, capture.source.name,
                   "column '" + shown(voltage.name, 40) + "' is in " + std::string(symbol(voltage.unit)) + ", not in V",
                   "name the voltage column with --voltage");
  }
  if (const Result<void> fine = check_current_unit(capture, current, bench.current); !fine) return failure(fine);
  record.volt_name = voltage.name;
  record.amp_name = current.name;
  record.findings = capture.findings;
  if (record.columns.voltage_low) record.corrections.push_back({"voltage low column subtracted", 1, Unit::one});
  if (record.columns.current_low) record.corrections.push_back({"current low column subtracted", 1, Unit::one});
  const Factors factors = take_factors(bench, options, record);
  take_timing(bench, options, record);
  if (const Result<void> taken = take_samples(capture, factors, record); !taken) return failure(taken);
  return record;
}

void take_turns_ratio(DrivenRecord& record, const StatedValue& ratio, const PropagationOptions& options) {
  for (double& v : record.volts) v *= ratio.value;
  record.volt_resolution *= std::fabs(ratio.value);
  record.corrections.push_back({"turns ratio", ratio.value, Unit::one});
  if (ratio.law == Law::unstated || ratio.law == Law::exact) return;
  record.errors.voltage_gain = both(record.errors.voltage_gain, ratio_error("turns ratio", ratio, 0, options));
  record.errors.voltage_gain.source = "voltage gain and turns ratio";
}

std::complex<double> current_chain(double omega, double skew_s, double shunt_tau_s, double probe_corner_hz) {
  using namespace std::complex_literals;
  const double corner = 2 * std::numbers::pi * probe_corner_hz;
  const std::complex<double> probe = corner > 0 ? 1i * omega / (1i * omega + corner) : 1.0;
  return std::polar(1.0, -omega * skew_s) * (1.0 + 1i * omega * shunt_tau_s) * probe;
}

namespace {

/// The samples `delay` steps later, by a cubic through the four nearest.
std::vector<double> shifted(const std::vector<double>& v, double delay) {
  const double whole = std::floor(delay);
  const double t = delay - whole;
  const auto offset = static_cast<std::ptrdiff_t>(whole);
  const auto size = static_cast<std::ptrdiff_t>(v.size());
  std::vector<double> out(v.size(), std::nan(""));
  const double w[4] = {-t * (t - 1) * (t - 2) / 6, (t + 1) * (t - 1) * (t - 2) / 2, -(t + 1) * t * (t - 2) / 2,
                       (t + 1) * t * (t - 1) / 6};
  for (std::ptrdiff_t i = 0; i < size; ++i) {
    const std::ptrdiff_t at = i + offset;
    if (t == 0) {
      if (at >= 0 && at < size) out[static_cast<std::size_t>(i)] = v[static_cast<std::size_t>(at)];
      continue;
    }
    if (at < 1 || at + 2 >= size) continue;
    double sum = 0;
    for (std::ptrdiff_t k = 0; k < 4; ++k) sum += w[k] * v[static_cast<std::size_t>(at - 1 + k)];
    out[static_cast<std::size_t>(i)] = sum;
  }
  return out;
}

/// i + tau di/dt = m, solved exactly for m running straight from sample to sample.
void take_out_shunt_inductance(std::vector<double>& m, double step, double tau) {
  const double ratio = step / tau;
  const double decay = std::exp(-ratio);
  double i = std::nan(""), before = std::nan("");
  for (double& now : m) {
    if (std::isnan(now)) continue;
    if (std::isnan(i)) {
      i = before = now;
      continue;
    }
    const double slope = (now - before) / ratio;  // per tau
    // Particular solution m - slope, and what is left of the start.
    i = now - slope + (i - before + slope) * decay;
    before = now;
    now = i;
  }
}

/// A one-pole high-pass loses corner times the integral of what it shows.
void take_out_droop(std::vector<double>& m, double step, double corner) {
  double lost = 0, before = std::nan("");
  for (double& now : m) {
    if (std::isnan(now)) continue;
    const double shown_now = now;
    if (!std::isnan(before)) lost += corner * step * (before + shown_now) / 2;
    before = shown_now;
    now = shown_now + lost;
  }
}

}  // namespace

DrivenRecord corrected_in_time(const DrivenRecord& record) {
  DrivenRecord corrected = record;
  if (record.probe_corner_hz > 0) {
    take_out_droop(corrected.amps, record.step_s, 2 * std::numbers::pi * record.probe_corner_hz);
  }
  if (record.shunt_tau_s > 0) take_out_shunt_inductance(corrected.amps, record.step_s, record.shunt_tau_s);
  if (record.skew_s != 0) corrected.amps = shifted(corrected.amps, record.skew_s / record.step_s);
  corrected.skew_s = corrected.shunt_tau_s = corrected.probe_corner_hz = 0;
  return corrected;
}

}  // namespace coilassay

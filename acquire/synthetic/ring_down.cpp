#include "acquire/synthetic/ring_down.h"

#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <complex>
#include <limits>
#include <numbers>

#include "acquire/synthetic/resonant_circuit.h"
#include "acquire/synthetic/scope.h"
#include "base/digest.h"

namespace coilassay::synthetic {

namespace {

constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kRecordDecayTimes = 8, kRecordPeriods = 40, kSamplesPerPeriod = 10;
constexpr double kGateVolts = 5;                            // of the drive channel while the drive is on
constexpr double kGateNoise = 1e-3 * kGateVolts;            // a logic signal on a range of its own
constexpr std::size_t kMostSamples = std::size_t{1} << 28;  // 2 GiB a channel

Result<void> refused(const std::string& finding, const std::string& remedy) {
  return failure(Problem::bad_number, "simulated ring-down", finding, remedy);
}

Result<void> check(const RingDownBench& b) {
  enum class Rule { above_zero, not_negative, any };
  struct Item {
    const char* what;
    double value;
    const char* unit;
    Rule rule;
  };
  const bool no_probe = b.probe_resistance_ohm == std::numeric_limits<double>::infinity();
  const Item items[] = {
      {"inductance", b.inductance_h, "H", Rule::above_zero},
      {"resistance", b.resistance_ohm, "ohm", Rule::not_negative},
      {"parallel capacitance", b.parallel_capacitance_f, "F", Rule::not_negative},
      {"saturation", b.saturation_per_a2, "1/A^2", Rule::not_negative},
      {"capacitance", b.capacitance_f, "F", Rule::above_zero},
      {"dissipation of the capacitor", b.capacitor_dissipation, "", Rule::not_negative},
      {"probe capacitance", b.probe_capacitance_f, "F", Rule::not_negative},
      {"probe resistance", no_probe ? 1 : b.probe_resistance_ohm, "ohm", Rule::above_zero},
      {"resistance across", b.across_resistance_ohm, "ohm", Rule::not_negative},
      {"capacitance across", b.across_capacitance_f, "F", Rule::not_negative},
      {"amplitude ratio of the second mode", b.second_amplitude_ratio, "", Rule::any},
      {"frequency ratio of the second mode", b.second_frequency_ratio, "", Rule::above_zero},
      {"decay ratio of the second mode", b.second_decay_ratio, "", Rule::not_negative},
      {"initial current", b.initial_current_a, "A", Rule::any},
      {"initial voltage", b.initial_voltage_v, "V", Rule::any},
      {"drive time", b.drive_time_s, "s", Rule::not_negative},
      {"drive frequency", b.drive_frequency_hz, "Hz", Rule::not_negative},
      {"transient ratio", b.transient_ratio, "", Rule::any},
      {"transient time constant", b.transient_tau_s, "s",
       b.transient_ratio != 0 ? Rule::above_zero : Rule::not_negative},
      {"sample interval", b.sample_interval_s, "s", Rule::not_negative},
      {"pre-trigger fraction", b.pretrigger_fraction, "", Rule::not_negative},
      {"noise", b.noise_v, "V", Rule::not_negative},
      {"offset", b.offset_v, "V", Rule::any},
      {"gain", b.gain, "", Rule::any},
      {"time base error", b.timebase_error, "", Rule::any},
      {"full scale", b.full_scale_v, "V", Rule::not_negative},
  };
  for (const Item& item : items) {
    const bool good = std::isfinite(item.value) && (item.rule == Rule::any || item.value > 0 ||
                                                    (item.rule == Rule::not_negative && item.value == 0));
    if (good) continue;
    const char* needed = item.rule == Rule::above_zero     ? "a value above zero"
                         : item.rule == Rule::not_negative ? "zero or a value above it"
                                                           : "a finite value";
    return refused(fmt::format("the {} is {}{}{}, which no bench can have", item.what, item.value,
                               *item.unit ? " " : "", item.unit),
                   fmt::format("give {}", needed));
  }
  if (b.pretrigger_fraction >= 1)
    return refused("the pre-trigger fraction leaves no sample after the release", "give a value below 1");
  if (std::fabs(b.timebase_error) >= 0.5)
    return refused("a time base off by half or more is no clock", "give a ratio such as 25 ppm");
  if (b.bits < 0 || b.bits > 24)
    return refused(fmt::format("a converter of {} bits", b.bits), "give 1 to 24 bits, or 0 for none");
  if (b.samples < 2 || b.samples > kMostSamples) {
    return refused(fmt::format("a record of {} samples", b.samples), fmt::format("give 2 to {} samples", kMostSamples));
  }
  return {};
}

double total_capacitance(const RingDownBench& b) {
  return b.capacitance_f + b.probe_capacitance_f + b.across_capacitance_f + b.parallel_capacitance_f;
}

double conductance(const RingDownBench& b) {
  return 1 / b.probe_resistance_ohm + (b.across_resistance_ohm > 0 ? 1 / b.across_resistance_ohm : 0);
}

/// Current in the coil and voltage of the node while the drive is on: times from -drive_time to 0.
class Drive {
 public:
  Drive(const RingDownBench& bench, double node_voltage_at_release)
      : bench_(bench), omega_(kTwoPi * bench.drive_frequency_hz) {
    if (omega_ == 0) return;
    // i = Re(phasor e^(j w t)) with the current of the release and the slope that the node's voltage asks for.
    const double i = bench.initial_current_a;
    phasor_ = {i, -(node_voltage_at_release - bench.resistance_ohm * i) / incremental(i) / omega_};
  }

  double node_voltage(double t_s) const {
    double i = bench_.initial_current_a, slope = 0;
    if (omega_ > 0) {
      const std::complex<double> now = phasor_ * std::polar(1.0, omega_ * t_s);
      i = now.real();
      slope = -omega_ * now.imag();
    } else {
      const double rise = bench_.drive_time_s / 2, since = t_s + bench_.drive_time_s;
      if (since < rise) {
        slope = i / rise;
        i *= since / rise;
      }
    }
    return bench_.resistance_ohm * i + incremental(i) * slope;
  }

 private:
  double incremental(double i) const { return bench_.inductance_h / (1 + bench_.saturation_per_a2 * i * i); }
  const RingDownBench& bench_;
  double omega_;
  std::complex<double> phasor_;
};

/// Amplitude and phase the ringing would have without loss: what second mode and transient are measured by.
std::complex<double> undamped_phasor(const RingDownBench& b) {
  return {b.initial_voltage_v, b.initial_current_a * std::sqrt(b.inductance_h / total_capacitance(b))};
}

RingDownTruth truth_of(const RingDownBench& b, const ResonantCircuit& circuit) {
  RingDownTruth truth{};
  const double infinity = std::numeric_limits<double>::infinity();
  const double omega0 = circuit.omega0();
  truth.l_s_h = b.inductance_h;
  truth.r_s_ohm = b.resistance_ohm;
  truth.f_0_hz = omega0 / kTwoPi;
  truth.f_d_hz = circuit.damped_omega() / kTwoPi;
  truth.alpha_per_s = circuit.alpha();
  truth.q = circuit.alpha() > 0 ? omega0 / (2 * circuit.alpha()) : infinity;
  truth.q_coil = b.resistance_ohm > 0 ? omega0 * b.inductance_h / b.resistance_ohm : infinity;
  truth.c_total_f = total_capacitance(b);
  const CircuitState largest = circuit.largest({b.initial_current_a, b.initial_voltage_v});
  truth.peak_current_a = largest.current_a;
  truth.peak_voltage_v = largest.voltage_v;
  truth.c_par_f = b.parallel_capacitance_f;
  // The two relations solved for L_s and R_s with the capacitance a bench without C_par would be stated with.
  const double c = truth.c_total_f - b.parallel_capacitance_f, g = conductance(b);
  const double coil_rate = 2 * circuit.alpha() - g / c - omega0 * b.capacitor_dissipation;
  truth.apparent_l_s_h = 1 / (omega0 * omega0 * c - coil_rate * g);
  truth.apparent_r_s_ohm = coil_rate * truth.apparent_l_s_h;
  return truth;
}

Timebase timebase_of(const RingDownBench& b, const ResonantCircuit& circuit) {
  Timebase timebase;
  timebase.samples = b.samples;
  timebase.before = std::min(
      b.samples - 1, static_cast<std::size_t>(std::lround(b.pretrigger_fraction * static_cast<double>(b.samples))));
  timebase.error = b.timebase_error;
  timebase.interval_s = b.sample_interval_s;
  if (timebase.interval_s == 0) {
    const double period = kTwoPi / circuit.omega0();
    double span = kRecordPeriods * period;
    if (circuit.slowest_rate() > 0) span = std::min(span, kRecordDecayTimes / circuit.slowest_rate());
    timebase.interval_s = std::min(span / static_cast<double>(b.samples), period / kSamplesPerPeriod);
  }
  return timebase;
}

/// Peaks of a coil that saturates: over the first period, which is the longest it can take.
bool find_saturating_peaks(const RingDownBench& b, const ResonantCircuit& circuit, const CircuitState& release,
                           RingDownTruth& truth) {
  constexpr std::size_t kPoints = 20000;
  const double step = kTwoPi / circuit.omega0() / static_cast<double>(kPoints);
  truth.peak_current_a = truth.peak_voltage_v = 0;
  return circuit.step_saturating(
      release, b.saturation_per_a2, kPoints, [&](std::size_t n) { return static_cast<double>(n) * step; },
      [&](std::size_t, const CircuitState& state) {
        truth.peak_current_a = std::max(truth.peak_current_a, std::fabs(state.current_a));
        truth.peak_voltage_v = std::max(truth.peak_voltage_v, std::fabs(circuit.node_voltage(state)));
      });
}

void add_second_mode_and_transient(const RingDownBench& b, const ResonantCircuit& circuit, const Timebase& timebase,
                                   std::vector<double>& volts) {
  const std::complex<double> first = undamped_phasor(b);
  const double amplitude = std::abs(first);
  const double omega =
      (circuit.damped_omega() > 0 ? circuit.damped_omega() : circuit.omega0()) * b.second_frequency_ratio;
  const double rate = circuit.alpha() * b.second_decay_ratio;
  for (std::size_t n = timebase.before; n < timebase.samples; ++n) {
    const double t = timebase.true_time_s(n);
    if (b.second_amplitude_ratio != 0) {
      volts[n] += b.second_amplitude_ratio * std::exp(-rate * t) * (first * std::polar(1.0, omega * t)).real();
    }
    if (b.transient_ratio != 0) volts[n] += b.transient_ratio * amplitude * std::exp(-t / b.transient_tau_s);
  }
}

Source source_of(const std::vector<Channel>& channels) {
  static_assert(std::endian::native == std::endian::little, "the digest is defined over little-endian samples");
  Source source;
  source.name = "simulated";
  Sha256 digest;
  for (const Channel& channel : channels) {
    const auto bytes = std::as_bytes(std::span(channel.samples));
    digest.add({reinterpret_cast<const char*>(bytes.data()), bytes.size()});
    source.bytes += bytes.size();
  }
  source.sha256 = digest.finish();
  return source;
}

}  // namespace

Result<RingDownRecord> simulate_ring_down(const RingDownBench& bench) {
  if (const auto good = check(bench); !good) return failure(good);
  const ResonantCircuit circuit(bench.inductance_h, bench.resistance_ohm, total_capacitance(bench), conductance(bench),
                                bench.capacitor_dissipation);
  const CircuitState release{bench.initial_current_a, bench.initial_voltage_v};
  RingDownRecord record;
  record.truth = truth_of(bench, circuit);
  const Timebase timebase = timebase_of(bench, circuit);
  if (!std::isfinite(circuit.omega0()) || !std::isfinite(circuit.alpha()) || !(circuit.omega0() > 0) ||
      !std::isfinite(timebase.true_time_s(timebase.samples)) || !(timebase.interval_s > 0)) {
    return failure(refused("frequency or decay of this circuit is beyond what a number can hold", "give usual values"));
  }

  std::vector<double> volts(timebase.samples, 0.0), gate(bench.drive_channel ? timebase.samples : 0, 0.0);
  const Drive drive(bench, circuit.node_voltage(release));
  for (std::size_t n = 0; n < timebase.before; ++n) {
    const double t = timebase.true_time_s(n);
    const bool on = bench.drive_time_s > 0 && t >= -bench.drive_time_s;
    if (on) volts[n] = drive.node_voltage(t);
    if (bench.drive_channel && (on || bench.drive_time_s == 0)) gate[n] = kGateVolts;
  }
  const auto time_after = [&](std::size_t n) { return timebase.true_time_s(timebase.before + n); };
  const auto keep = [&](std::size_t n, const CircuitState& state) {
    volts[timebase.before + n] = circuit.node_voltage(state);
  };
  const std::size_t after = timebase.samples - timebase.before;
  if (bench.saturation_per_a2 > 0) {
    if (!circuit.step_saturating(release, bench.saturation_per_a2, after, time_after, keep) ||
        !find_saturating_peaks(bench, circuit, release, record.truth)) {
      return failure(refused("this saturating coil would need more than 20 million steps",
                             "give a shorter record, less saturation or less damping"));
    }
  } else {
    for (std::size_t n = 0; n < after; ++n) keep(n, circuit.at(release, time_after(n)));
  }
  if (bench.second_amplitude_ratio != 0 || bench.transient_ratio != 0) {
    add_second_mode_and_transient(bench, circuit, timebase, volts);
  }

  Capture& capture = record.capture;
  capture.time = timebase.axis();
  Random noise(bench.seed);
  capture.channels.push_back(seen_through({bench.gain, bench.offset_v, bench.noise_v, bench.bits, bench.full_scale_v},
                                          "CH1", Unit::volt, std::move(volts), noise));
  if (bench.drive_channel) {
    Random gate_noise(bench.seed, 2);
    const ScopeInput input{1, 0, bench.noise_v > 0 ? kGateNoise : 0, bench.bits, 1.2 * kGateVolts};
    capture.channels.push_back(seen_through(input, "CH2", Unit::volt, std::move(gate), gate_noise));
  }
  for (std::size_t i = 0; i < capture.channels.size(); ++i) capture.channels[i].column = i + 2;  // time is the first
  for (const Channel& channel : capture.channels) {
    if (!std::all_of(channel.samples.begin(), channel.samples.end(), [](double v) { return std::isfinite(v); })) {
      return failure(refused("the voltages of this bench are beyond what a number can hold", "give usual values"));
    }
  }
  capture.source = source_of(capture.channels);
  return record;
}

}  // namespace coilassay::synthetic

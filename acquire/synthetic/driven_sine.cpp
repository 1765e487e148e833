#include "acquire/synthetic/driven_sine.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <span>
#include <utility>
#include <vector>

#include "acquire/synthetic/scope.h"
#include "base/digest.h"
#include "base/random.h"

namespace coilassay::synthetic {

namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kPeriods = 20.3;
constexpr std::size_t kMostSamples = 100'000'000;

Result<void> refused(std::string finding, std::string remedy) {
  return failure(Problem::bad_number, "simulated sine", std::move(finding), std::move(remedy));
}

Result<void> check(const DrivenSineBench& b) {
  struct Item {
    const char* what;
    double value;
    bool above_zero;
    bool signed_value;
  };
  const Item items[] = {{"inductance", b.inductance_h, true, false},
                        {"resistance", b.resistance_ohm, false, false},
                        {"parallel capacitance", b.parallel_capacitance_f, false, false},
                        {"saturation", b.saturation_per_a2, false, false},
                        {"third harmonic", b.third_harmonic_ratio, false, true},
                        {"frequency", b.frequency_hz, true, false},
                        {"amplitude", b.amplitude_v, false, false},
                        {"phase", b.phase_rad, false, true},
                        {"bias", b.bias_a, false, true},
                        {"shunt", b.shunt_ohm, false, false},
                        {"shunt inductance", b.shunt_inductance_h, false, false},
                        {"skew", b.skew_s, false, true},
                        {"probe corner", b.probe_corner_hz, false, false},
                        {"current offset", b.current_offset_a, false, true},
                        {"current gain", b.current_gain, false, true},
                        {"current noise", b.current_noise_a, false, false},
                        {"current full scale", b.current_full_scale_a, false, false},
                        {"voltage offset", b.voltage_offset_v, false, true},
                        {"voltage gain", b.voltage_gain, false, true},
                        {"voltage noise", b.voltage_noise_v, false, false},
                        {"voltage full scale", b.voltage_full_scale_v, false, false},
                        {"sample interval", b.sample_interval_s, false, false},
                        {"time base", b.timebase_error, false, true}};
  for (const Item& item : items) {
    const bool fine = std::isfinite(item.value) && (item.signed_value || item.value >= 0) &&
                      (!item.above_zero || item.value > 0);
    if (fine) continue;
    return refused(fmt::format("the {} is {}, which no bench can have", item.what, item.value),
                   item.above_zero ? "give a value above zero" : item.signed_value ? "give a finite value" : "give zero or more");
  }
  if (b.shunt_inductance_h > 0 && !(b.shunt_ohm > 0)) return refused("a shunt inductance without a shunt", "give the shunt as well");
  if (b.over_shunt && !(b.shunt_ohm > 0)) return refused("a voltage over coil and shunt without a shunt", "give the shunt as well");
  if (std::fabs(b.timebase_error) >= 0.5) return refused("a time base off by half or more is no clock", "give a ratio such as 25 ppm");
  if (b.bits < 0 || b.bits > 24) return refused(fmt::format("a converter of {} bits", b.bits), "give 1 to 24 bits, or 0 for none");
  if (b.samples < 2 || b.samples > kMostSamples) {
    return refused(fmt::format("a record of {} samples", b.samples), fmt::format("give 2 to {} samples", kMostSamples));
  }
  return {};
}

Complex coil_impedance(const DrivenSineBench& b, double omega) {
  const double inductance = b.inductance_h / (1 + b.saturation_per_a2 * b.bias_a * b.bias_a);
  const Complex series(b.resistance_ohm, omega * inductance);
  return series / (1.0 + Complex(0, omega * b.parallel_capacitance_f) * series);
}

/// What the current channel shows of a current phasor, in its own unit.
Complex shown_current(const DrivenSineBench& b, double omega, Complex current) {
  if (b.shunt_ohm > 0) current *= Complex(b.shunt_ohm, omega * b.shunt_inductance_h);
  if (b.probe_corner_hz > 0) current *= Complex(0, omega) / Complex(kTwoPi * b.probe_corner_hz, omega);
  return current * std::polar(1.0, -omega * b.skew_s);
}

DrivenSineTruth truth_of(const DrivenSineBench& b, Complex z, double omega) {
  const double magnitude = std::abs(z), r = z.real(), x = z.imag();
  const double current = b.amplitude_v / magnitude;
  return {b.frequency_hz, magnitude, std::arg(z), r, x, x / omega, magnitude * magnitude / r,
          magnitude * magnitude / (x * omega), std::fabs(x) / r, r / std::fabs(x), current * current * r / 2, current};
}

Source source_of(const std::vector<Channel>& channels) {
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

Result<DrivenSineRecord> simulate_driven_sine(const DrivenSineBench& b) {
  if (const auto good = check(b); !good) return failure(good);
  const double omega = kTwoPi * b.frequency_hz;
  const Complex z = coil_impedance(b, omega);
  const Complex v = std::polar(b.amplitude_v, b.phase_rad), i = v / z;
  // The crest of the third harmonic stands on the fundamental's.
  const Complex third = b.third_harmonic_ratio * std::polar(std::abs(i), 3 * std::arg(i));

  DrivenSineRecord record;
  record.truth = truth_of(b, z, omega);
  const double scale = b.shunt_ohm > 0 ? b.shunt_ohm : 1;  // of a current in the current channel
  const Complex shown_v = b.over_shunt ? v + Complex(b.shunt_ohm, omega * b.shunt_inductance_h) * i : v;
  const Complex shown_i = shown_current(b, omega, i), shown_third = shown_current(b, 3 * omega, third);
  const double bias_v = b.bias_a * (b.resistance_ohm + (b.over_shunt ? b.shunt_ohm : 0));
  const double bias_i = b.probe_corner_hz > 0 ? 0 : b.bias_a * scale;

  const double interval =
      b.sample_interval_s > 0 ? b.sample_interval_s : kPeriods / (b.frequency_hz * static_cast<double>(b.samples));
  const Timebase timebase{b.samples, 0, interval, b.timebase_error};
  std::vector<double> volts(b.samples), amps(b.samples);
  for (std::size_t n = 0; n < b.samples; ++n) {
    const double angle = std::remainder(omega * timebase.true_time_s(n), kTwoPi);
    const Complex turn = std::polar(1.0, angle);
    volts[n] = (shown_v * turn).real() + bias_v;
    amps[n] = (shown_i * turn).real() + (shown_third * std::polar(1.0, 3 * angle)).real() + bias_i;
  }
  Capture& capture = record.capture;
  capture.time = timebase.axis();
  Random v_noise(b.seed), i_noise(b.seed, 2);
  capture.channels.push_back(
      seen_through({b.voltage_gain, b.voltage_offset_v, b.voltage_noise_v, b.bits, b.voltage_full_scale_v}, "CH1", Unit::volt,
                   std::move(volts), v_noise));
  capture.channels.push_back(seen_through({b.current_gain, b.current_offset_a * scale, b.current_noise_a * scale, b.bits,
                                           b.current_full_scale_a * scale},
                                          "CH2", b.shunt_ohm > 0 ? Unit::volt : Unit::ampere, std::move(amps), i_noise));
  for (std::size_t c = 0; c < 2; ++c) capture.channels[c].column = c + 2;  // time is the first
  for (const Channel& channel : capture.channels) {
    if (std::all_of(channel.samples.begin(), channel.samples.end(), [](double s) { return std::isfinite(s); })) continue;
    return failure(refused("voltages or currents of this bench are beyond what a number can hold", "give usual values"));
  }
  capture.source = source_of(capture.channels);
  return record;
}

}  // namespace coilassay::synthetic

#include "acquire/synthetic/driven_burst.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <numbers>
#include <span>
#include <utility>
#include <vector>

#include "acquire/synthetic/burst_source.h"
#include "acquire/synthetic/scope.h"
#include "base/digest.h"

namespace coilassay::synthetic {

namespace {

constexpr std::ptrdiff_t kFiner = 16;      // points of the source's grid in a sample interval
constexpr double kSourceBand = 0.2;        // of the sample rate: where each pole of the source lies
constexpr std::size_t kMostSamples = 20'000'000;

tl::unexpected<Error> refused(std::string finding, std::string remedy) {
  return failure(Problem::bad_number, "simulated burst", std::move(finding), std::move(remedy));
}

Result<void> check_numbers(const DrivenBurstBench& b) {
  struct Item {
    const char* what;
    double value;
    bool above_zero;
    bool signed_value;
  };
  const Item items[] = {{"inductance", b.inductance_h, true, false},
                        {"resistance", b.resistance_ohm, false, false},
                        {"parallel capacitance", b.parallel_capacitance_f, true, false},
                        {"parallel resistance", b.parallel_resistance_ohm, false, false},
                        {"amplitude", b.amplitude_v, false, false},
                        {"source resistance", b.source_ohm, true, false},
                        {"pulse width", b.width_s, true, false},
                        {"rise time", b.rise_s, true, false},
                        {"lowest frequency", b.from_hz, false, false},
                        {"highest frequency", b.to_hz, true, false},
                        {"filled share", b.filled, true, false},
                        {"shunt", b.shunt_ohm, false, false},
                        {"shunt inductance", b.shunt_inductance_h, false, false},
                        {"skew", b.skew_s, false, true},
                        {"current offset", b.current_offset_a, false, true},
                        {"current gain", b.current_gain, false, true},
                        {"current noise", b.current_noise_a, false, false},
                        {"current full scale", b.current_full_scale_a, false, false},
                        {"voltage offset", b.voltage_offset_v, false, true},
                        {"voltage gain", b.voltage_gain, false, true},
                        {"voltage noise", b.voltage_noise_v, false, false},
                        {"voltage full scale", b.voltage_full_scale_v, false, false},
                        {"sample interval", b.sample_interval_s, true, false},
                        {"share before the burst", b.pretrigger_fraction, false, false},
                        {"time base", b.timebase_error, false, true}};
  for (const Item& item : items) {
    const bool fine = std::isfinite(item.value) && (item.signed_value || item.value >= 0) &&
                      (!item.above_zero || item.value > 0);
    if (fine) continue;
    return refused(fmt::format("the {} is {}, which no bench can have", item.what, item.value),
                   item.above_zero ? "give a value above zero" : item.signed_value ? "give a finite value" : "give zero or more");
  }
  return {};
}

Result<void> check(const DrivenBurstBench& b) {
  if (const auto fine = check_numbers(b); !fine) return fine;
  if (b.shunt_inductance_h > 0 && !(b.shunt_ohm > 0)) return refused("a shunt inductance without a shunt", "give the shunt as well");
  if (std::fabs(b.timebase_error) >= 0.5) return refused("a time base off by half or more is no clock", "give a ratio such as 25 ppm");
  if (b.bits < 0 || b.bits > 24) return refused(fmt::format("a converter of {} bits", b.bits), "give 1 to 24 bits, or 0 for none");
  if (b.samples < 64 || b.samples > kMostSamples) {
    return refused(fmt::format("a record of {} samples", b.samples), fmt::format("give 64 to {} samples", kMostSamples));
  }
  const double record_s = static_cast<double>(b.samples) * b.sample_interval_s;
  if (b.pretrigger_fraction >= 0.9) return refused("nearly all of the record lies before the burst", "give a share below 0.9");
  if (b.filled > 1) return refused("a chirp longer than the record", "give at most 1");
  if (std::fabs(b.skew_s) > 0.1 * record_s) return refused("the skew is more than a tenth of the record", "give a smaller skew");
  if (b.kind == BurstKind::pulse) {
    if (b.pulses < 1) return refused("a burst without a pulse", "give 1 or more");
    const double room = (1 - b.pretrigger_fraction) * record_s / static_cast<double>(b.pulses);
    if (b.width_s + b.rise_s > room) return refused("the pulses overlap, or the record is shorter than one", "use shorter pulses or a longer record");
    if (b.rise_s > b.width_s) return refused("the edges are longer than the pulse", "use a shorter rise time");
  } else {
    if (b.from_hz >= b.to_hz) return refused("the band ends before it begins", "give a highest frequency above the lowest");
    if (b.to_hz * b.sample_interval_s > 0.4) return refused("the samples are too far apart for the highest frequency", "use a shorter interval");
  }
  return {};
}

/// Coil current; voltage; the source behind its two poles and between them; the source before them and its slope.
enum State : std::size_t { kCoil, kVolts, kDrive, kBetween, kSource, kSlope, kStates };
using Vector = std::array<double, kStates>;
using Matrix = std::array<Vector, kStates>;

Matrix product(const Matrix& a, const Matrix& b) {
  Matrix c{};
  for (std::size_t i = 0; i < kStates; ++i) {
    for (std::size_t k = 0; k < kStates; ++k) {
      for (std::size_t j = 0; j < kStates; ++j) c[i][j] += a[i][k] * b[k][j];
    }
  }
  return c;
}

Vector product(const Matrix& a, const Vector& x) {
  Vector y{};
  for (std::size_t i = 0; i < kStates; ++i) {
    for (std::size_t j = 0; j < kStates; ++j) y[i] += a[i][j] * x[j];
  }
  return y;
}

/// exp(A t): halved until small, Taylor series, squared again.
Matrix exponential(Matrix a, double t) {
  double largest = 0;
  for (Vector& row : a) {
    double sum = 0;
    for (double& x : row) sum += std::fabs(x *= t);
    largest = std::max(largest, sum);
  }
  int halvings = 0;
  for (; largest > 0.25; largest /= 2) ++halvings;
  for (Vector& row : a) {
    for (double& x : row) x = std::ldexp(x, -halvings);
  }
  Matrix sum{}, term{};
  for (std::size_t i = 0; i < kStates; ++i) sum[i][i] = term[i][i] = 1;
  for (int n = 1; n <= 14; ++n) {
    term = product(term, a);
    for (std::size_t i = 0; i < kStates; ++i) {
      for (std::size_t j = 0; j < kStates; ++j) {
        term[i][j] /= n;
        sum[i][j] += term[i][j];
      }
    }
  }
  for (int n = 0; n < halvings; ++n) sum = product(sum, sum);
  return sum;
}

class Circuit {
 public:
  explicit Circuit(const DrivenBurstBench& b)
      : b_(b), leak_s_(b.parallel_resistance_ohm > 0 ? 1 / b.parallel_resistance_ohm : 0) {
    const double c = b.parallel_capacitance_f, pole = 2 * std::numbers::pi * kSourceBand / b.sample_interval_s;
    a_[kCoil][kCoil] = -b.resistance_ohm / b.inductance_h;
    a_[kCoil][kVolts] = 1 / b.inductance_h;
    a_[kVolts][kCoil] = -1 / c;
    a_[kVolts][kVolts] = -(1 / b.source_ohm + leak_s_) / c;
    a_[kVolts][kDrive] = 1 / (b.source_ohm * c);
    a_[kDrive][kDrive] = a_[kBetween][kBetween] = -pole;
    a_[kDrive][kBetween] = a_[kBetween][kSource] = pole;
    a_[kSource][kSlope] = 1;
  }
  Matrix over(double t) const { return exponential(a_, t); }
  double current(const Vector& x) const { return (x[kDrive] - x[kVolts]) / b_.source_ohm; }
  /// What the current channel shows, in its own unit.
  double shown(const Vector& x) const {
    if (!(b_.shunt_ohm > 0)) return current(x);
    double slope = 0;   // of the current, times the source's resistance
    for (std::size_t j = 0; j < kStates; ++j) slope += (a_[kDrive][j] - a_[kVolts][j]) * x[j];
    return b_.shunt_ohm * current(x) + b_.shunt_inductance_h * slope / b_.source_ohm;
  }

 private:
  const DrivenBurstBench& b_;
  double leak_s_;
  Matrix a_{};
};

struct Waves {
  std::vector<double> volts, amps;
  double peak_a = 0;
};

Waves run(const DrivenBurstBench& b) {
  const double interval = b.sample_interval_s * (1 + b.timebase_error);
  const double step = interval / static_cast<double>(kFiner);
  const auto count = static_cast<std::ptrdiff_t>(b.samples);
  const Circuit circuit(b);
  const Matrix whole = circuit.over(step);
  // A sample of the current is the current `skew` earlier, inside a step at the same place every time.
  const double back = -b.skew_s / step;
  const auto back_whole = static_cast<std::ptrdiff_t>(std::floor(back));
  const Matrix part = circuit.over((back - static_cast<double>(back_whole)) * step);

  // What never began fills the circuit's memory before the record; what begins inside it needs only the skew's room.
  const bool endless = b.kind == BurstKind::noise || (b.kind == BurstKind::chirp && b.filled >= 1);
  const std::ptrdiff_t skew_room = std::abs(back_whole) + 2;
  const std::ptrdiff_t first = -(skew_room + (endless ? count * kFiner / 4 : 0));
  const std::ptrdiff_t end = (count - 1) * kFiner + skew_room;
  BurstSource source(b, step, interval * static_cast<double>(b.samples), first);
  Waves waves{std::vector<double>(b.samples), std::vector<double>(b.samples), 0};
  Vector x{};
  x[kSource] = source.next();
  for (std::ptrdiff_t k = first; k < end; ++k) {
    const double e = source.next();
    x[kSlope] = (e - x[kSource]) / step;
    if (k >= 0 && k % kFiner == 0 && k / kFiner < count) {
      waves.volts[static_cast<std::size_t>(k / kFiner)] = x[kVolts];
      waves.peak_a = std::max(waves.peak_a, std::fabs(circuit.current(x)));
    }
    const std::ptrdiff_t of_amps = k - back_whole;
    if (of_amps >= 0 && of_amps % kFiner == 0 && of_amps / kFiner < count) {
      waves.amps[static_cast<std::size_t>(of_amps / kFiner)] = circuit.shown(product(part, x));
    }
    x = product(whole, x);
    x[kSource] = e;  // exactly, not but for rounding
  }
  return waves;
}

/// Im Z = 0 where w² = 1/(L C) - (R/L)²; R_par does not move it.
double resonance_of(const DrivenBurstBench& b) {
  const double square = 1 / (b.inductance_h * b.parallel_capacitance_f) - std::pow(b.resistance_ohm / b.inductance_h, 2);
  return square > 0 ? std::sqrt(square) / (2 * std::numbers::pi) : std::nan("");
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

Result<DrivenBurstRecord> simulate_driven_burst(const DrivenBurstBench& b) {
  if (const auto good = check(b); !good) return failure(good);
  Waves waves = run(b);
  DrivenBurstRecord record;
  record.truth = {b.inductance_h, b.resistance_ohm, b.parallel_capacitance_f,
                  b.parallel_resistance_ohm > 0 ? b.parallel_resistance_ohm : std::numeric_limits<double>::infinity(),
                  resonance_of(b), waves.peak_a};
  const double scale = b.shunt_ohm > 0 ? b.shunt_ohm : 1;  // of a current in the current channel
  const bool endless = b.kind == BurstKind::noise || (b.kind == BurstKind::chirp && b.filled >= 1);
  const auto before = static_cast<std::size_t>(endless ? 0 : b.pretrigger_fraction * static_cast<double>(b.samples));
  Capture& capture = record.capture;
  capture.time = Timebase{b.samples, before, b.sample_interval_s, b.timebase_error}.axis();
  Random v_noise(b.seed), i_noise(b.seed, 2);
  capture.channels.push_back(
      seen_through({b.voltage_gain, b.voltage_offset_v, b.voltage_noise_v, b.bits, b.voltage_full_scale_v}, "CH1", Unit::volt,
                   std::move(waves.volts), v_noise));
  capture.channels.push_back(seen_through({b.current_gain, b.current_offset_a * scale, b.current_noise_a * scale, b.bits,
                                           b.current_full_scale_a * scale},
                                          "CH2", b.shunt_ohm > 0 ? Unit::volt : Unit::ampere, std::move(waves.amps), i_noise));
  for (std::size_t c = 0; c < 2; ++c) capture.channels[c].column = c + 2;  // time is the first
  for (const Channel& channel : capture.channels) {
    if (std::all_of(channel.samples.begin(), channel.samples.end(), [](double s) { return std::isfinite(s); })) continue;
    return refused("voltages or currents of this bench are beyond what a number can hold", "give usual values");
  }
  capture.source = source_of(capture.channels);
  return record;
}

}  // namespace coilassay::synthetic

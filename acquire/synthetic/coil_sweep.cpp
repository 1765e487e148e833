#include "acquire/synthetic/coil_sweep.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <span>
#include <utility>

#include "base/digest.h"
#include "base/random.h"

namespace coilassay::synthetic {

namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kOutlier = 0.3;
constexpr std::size_t kMostPoints = 1'000'000;

Result<void> refused(std::string finding, std::string remedy) {
  return failure(Problem::bad_number, "simulated sweep", std::move(finding), std::move(remedy));
}

Result<void> check(const CoilSweepBench& b) {
  enum class Rule { above_zero, not_negative, any };
  struct Item {
    const char* what;
    double value;
    Rule rule;
  };
  const Item items[] = {{"inductance", b.inductance_h, Rule::above_zero},
                        {"resistance", b.resistance_ohm, Rule::not_negative},
                        {"skin resistance", b.skin_ohm, Rule::not_negative},
                        {"skin frequency", b.skin_frequency_hz, Rule::above_zero},
                        {"proximity resistance", b.proximity_ohm, Rule::not_negative},
                        {"proximity frequency", b.proximity_frequency_hz, Rule::above_zero},
                        {"parallel capacitance", b.parallel_capacitance_f, Rule::not_negative},
                        {"parallel resistance", b.parallel_resistance_ohm, Rule::not_negative},
                        {"second frequency", b.second_frequency_hz, Rule::not_negative},
                        {"second capacitance", b.second_capacitance_f, Rule::above_zero},
                        {"second Q", b.second_q, Rule::above_zero},
                        {"residual inductance", b.residual_inductance_h, Rule::any},
                        {"residual resistance", b.residual_resistance_ohm, Rule::any},
                        {"residual capacitance", b.residual_capacitance_f, Rule::any},
                        {"residual conductance", b.residual_conductance_s, Rule::any},
                        {"start", b.start_hz, Rule::above_zero},
                        {"stop", b.stop_hz, Rule::above_zero},
                        {"noise", b.noise_ratio, Rule::not_negative},
                        {"scattering noise", b.scattering_noise, Rule::not_negative},
                        {"reference", b.reference_ohm, Rule::above_zero},
                        {"scale", b.gain, Rule::above_zero},
                        {"phase error", b.phase_error_rad, Rule::any},
                        {"scattering error", std::abs(b.scattering_error), Rule::any},
                        {"step", b.step_ratio, Rule::any},
                        {"step frequency", b.step_frequency_hz, Rule::not_negative}};
  for (const Item& item : items) {
    const bool fine = std::isfinite(item.value) && (item.rule == Rule::any || item.value >= 0) &&
                      (item.rule != Rule::above_zero || item.value > 0);
    if (fine) continue;
    return refused(fmt::format("the {} is {}, which no bench can have", item.what, item.value),
                   item.rule == Rule::above_zero ? "give a value above zero" : item.rule == Rule::any ? "give a finite value" : "give zero or more");
  }
  if (b.proximity_ohm > 0 && !(kTwoPi * b.proximity_frequency_hz * b.inductance_h > b.proximity_ohm)) {
    return refused("the proximity loss would take more than the whole inductance", "give a smaller resistance or a higher corner");
  }
  if (!(b.stop_hz > b.start_hz)) return refused("the sweep stops before it starts", "give a stop above the start");
  if (b.points < 2 || b.points > kMostPoints) {
    return refused(fmt::format("a sweep of {} points", b.points), fmt::format("give 2 to {} points", kMostPoints));
  }
  if (b.outliers + b.marked > b.points) return refused("more spoilt points than points", "give fewer of them");
  return {};
}

double frequency_of(const CoilSweepBench& b, std::size_t i) {
  const double t = static_cast<double>(i) / static_cast<double>(b.points - 1);
  if (i == 0) return b.start_hz;
  if (i + 1 == b.points) return b.stop_hz;
  return b.linear ? b.start_hz + t * (b.stop_hz - b.start_hz) : b.start_hz * std::pow(b.stop_hz / b.start_hz, t);
}

double first_crossing(const CoilSweepBench& b) {
  // Fine enough for resonances of Q up to some hundred to show their sign.
  const double ratio = 1.002, end = 1e3 * b.stop_hz;
  double low = b.start_hz / 1e3, x = coil_impedance(b, low).imag();
  while (low < end) {
    const double high = low * ratio, y = coil_impedance(b, high).imag();
    if (x > 0 && y <= 0) {
      double left = low, right = high;
      for (int k = 0; k < 80; ++k) {
        const double middle = (left + right) / 2;
        (coil_impedance(b, middle).imag() > 0 ? left : right) = middle;
      }
      return (left + right) / 2;
    }
    low = high;
    x = y;
  }
  return std::nan("");
}

/// `count` different positions, none at either end, none of those already taken.
std::vector<std::size_t> places(std::size_t points, std::size_t count, const std::vector<std::size_t>& taken, Random& random) {
  std::vector<std::size_t> chosen;
  while (chosen.size() < count) {
    const std::size_t at = random.below(points);
    const bool free = std::find(taken.begin(), taken.end(), at) == taken.end() &&
                      std::find(chosen.begin(), chosen.end(), at) == chosen.end();
    if (free) chosen.push_back(at);
  }
  std::sort(chosen.begin(), chosen.end());
  return chosen;
}

Complex seen(const CoilSweepBench& b, double f, Complex z, Random& noise) {
  const double w = kTwoPi * f;
  const Complex open(b.residual_conductance_s, w * b.residual_capacitance_f);
  const Complex closed(b.residual_resistance_ohm, w * b.residual_inductance_h);
  z = closed + z / (1.0 + z * open);
  z *= std::polar(b.gain, b.phase_error_rad);
  if (b.step_frequency_hz > 0 && f >= b.step_frequency_hz) z *= 1 + b.step_ratio;
  if (b.noise_ratio > 0) z *= Complex(1 + b.noise_ratio * noise.normal(), b.noise_ratio * noise.normal());
  if (b.scattering_noise > 0 || b.scattering_error != 0.0) {
    Complex s = (z - b.reference_ohm) / (z + b.reference_ohm) + b.scattering_error;
    if (b.scattering_noise > 0) s += b.scattering_noise * Complex(noise.normal(), noise.normal());
    z = b.reference_ohm * (1.0 + s) / (1.0 - s);
  }
  return z;
}

Source source_of(const Sweep& sweep) {
  Source source;
  source.name = "simulated";
  Sha256 digest;
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    const double row[] = {sweep.frequency_hz[i], sweep.z_ohm[i][0].real(), sweep.z_ohm[i][0].imag()};
    const auto bytes = std::as_bytes(std::span(row));
    digest.add({reinterpret_cast<const char*>(bytes.data()), bytes.size()});
    source.bytes += bytes.size();
  }
  source.sha256 = digest.finish();
  return source;
}

}  // namespace

Complex coil_impedance(const CoilSweepBench& b, double f) {
  const double w = kTwoPi * f;
  Complex series(b.resistance_ohm, w * b.inductance_h);
  if (b.skin_ohm > 0) series += Complex(1, 1) * b.skin_ohm * std::sqrt(f / b.skin_frequency_hz);
  if (b.proximity_ohm > 0) {
    const double x = f / b.proximity_frequency_hz;
    series += b.proximity_ohm * x * x / Complex(1, x);
  }
  Complex across(0, w * b.parallel_capacitance_f);
  if (b.parallel_resistance_ohm > 0) across += 1 / b.parallel_resistance_ohm;
  if (b.second_frequency_hz > 0) {
    const double y = f / b.second_frequency_hz;
    across += Complex(0, w * b.second_capacitance_f) / Complex(1 - y * y, y / b.second_q);
  }
  return series / (1.0 + series * across);
}

Result<CoilSweepRecord> simulate_coil_sweep(const CoilSweepBench& b) {
  if (const auto good = check(b); !good) return failure(good);
  CoilSweepRecord record;
  Random noise(b.seed), spoiling(b.seed, 2);
  CoilSweepTruth& truth = record.truth;
  truth.marked = places(b.points, b.marked, {}, spoiling);
  truth.outliers = places(b.points, b.outliers, truth.marked, spoiling);
  truth.f_r_hz = first_crossing(b);
  truth.f_parallel_hz = b.parallel_capacitance_f > 0
                            ? 1 / (kTwoPi * std::sqrt(b.inductance_h * b.parallel_capacitance_f))
                            : std::nan("");
  Sweep& sweep = record.sweep;
  sweep.ports = 1;
  sweep.as_read = b.scattering_noise > 0 || b.scattering_error != 0.0 ? "S" : "Z";
  if (sweep.as_read == "S") sweep.reference_ohm = {b.reference_ohm};
  for (std::size_t i = 0; i < b.points; ++i) {
    const double f = frequency_of(b, i);
    sweep.frequency_hz.push_back(f);
    sweep.z_ohm.push_back({seen(b, f, coil_impedance(b, f), noise)});
    sweep.bad.push_back(false);
  }
  for (const std::size_t at : truth.outliers) {
    sweep.z_ohm[at][0] *= 1.0 + std::polar(kOutlier, spoiling.uniform(0, kTwoPi));
  }
  for (const std::size_t at : truth.marked) {
    sweep.z_ohm[at][0] *= std::polar(spoiling.uniform(2, 10), spoiling.uniform(0, kTwoPi));
    sweep.bad[at] = true;
  }
  for (std::size_t i = 0; i < b.points; ++i) {
    const Complex z = sweep.z_ohm[i][0];
    if (std::isfinite(z.real()) && std::isfinite(z.imag())) continue;
    return failure(refused("impedances of this bench are beyond what a number can hold", "give usual values"));
  }
  sweep.source = source_of(sweep);
  return record;
}

}  // namespace coilassay::synthetic

#include "acquire/synthetic/driven_resistance.h"

#include <algorithm>
#include <cmath>
#include <string>
#include <vector>

#include "base/random.h"

namespace coilassay::synthetic {

namespace {

constexpr double kMostSteps = 1e8;

class Winding {
 public:
  explicit Winding(const DrivenResistanceBench& bench) : bench_(bench), temperature_(bench.temperature_degc) {}

  double resistance() const { return resistance_at(temperature_); }
  double temperature() const { return temperature_; }

  /// Carries the current for so long; the polarity does not matter to the heat.
  void carry_for(double seconds) {
    if (!(bench_.thermal_resistance_k_per_w > 0) || !(seconds > 0)) return;
    const double most = bench_.thermal_time_s / 100;
    const auto steps = static_cast<std::size_t>(std::ceil(seconds / most));
    const double h = seconds / static_cast<double>(steps);
    for (std::size_t i = 0; i < steps; ++i) {
      const double k1 = slope(temperature_);
      const double k2 = slope(temperature_ + h / 2 * k1);
      const double k3 = slope(temperature_ + h / 2 * k2);
      const double k4 = slope(temperature_ + h * k3);
      temperature_ += h / 6 * (k1 + 2 * k2 + 2 * k3 + k4);
    }
  }

 private:
  double resistance_at(double degc) const {
    return bench_.resistance_20_ohm * (1 + bench_.coefficient_per_k * (degc - 20));
  }
  double slope(double degc) const {
    const double heat = bench_.current_a * bench_.current_a * resistance_at(degc) * bench_.thermal_resistance_k_per_w;
    return (heat - (degc - bench_.temperature_degc)) / bench_.thermal_time_s;
  }

  const DrivenResistanceBench& bench_;
  double temperature_;
};

double shown(double truth, double scale, double zero, double noise, double digit, Random& random) {
  double value = scale * truth + zero;
  if (noise > 0) value += noise * random.normal();
  return digit > 0 ? std::nearbyint(value / digit) * digit : value;
}

Result<void> check(const DrivenResistanceBench& b) {
  const auto refuse = [](const std::string& what, const std::string& remedy) {
    return failure(Problem::bad_number, "simulated bench", what, remedy);
  };
  if (b.readings == 0) return refuse("there is no reading", "give one or more");
  if (!(b.interval_s > 0)) return refuse("readings need an interval above zero", "give one such as 2 s");
  if (!(b.thermal_time_s > 0)) return refuse("the thermal time constant must be above zero", "give one such as 60 s");
  if (!(b.resistance_20_ohm * (1 + b.coefficient_per_k * (b.temperature_degc - 20)) > 0)) {
    return refuse("the resistance is not above zero at that temperature", "check resistance, coefficient and temperature");
  }
  const double seconds = b.preheat_s + b.interval_s * static_cast<double>(b.readings);
  if (b.thermal_resistance_k_per_w > 0 && seconds > kMostSteps / 100 * b.thermal_time_s) {
    return refuse("the thermal time constant is too short for so long a record", "take a longer one, or fewer readings");
  }
  // Heat that grows faster than it is given off has no end.
  if (b.current_a * b.current_a * b.resistance_20_ohm * b.coefficient_per_k * b.thermal_resistance_k_per_w >= 1) {
    return refuse("the winding would warm without end", "take less current, or a smaller thermal resistance");
  }
  return {};
}

}  // namespace

Result<DrivenResistanceRecord> simulate_driven_resistance(const DrivenResistanceBench& bench) {
  if (const Result<void> fine = check(bench); !fine) return failure(fine);
  Random random(bench.seed);
  Winding winding(bench);
  winding.carry_for(bench.preheat_s);

  DrivenResistanceRecord record;
  record.truth.r_dc_20_ohm = bench.resistance_20_ohm;
  record.truth.r_dc_ohm = winding.resistance();
  const double first_degc = winding.temperature();
  std::vector<double> volts, second;
  const std::size_t turn = std::max<std::size_t>(bench.before_reversal, 1);
  for (std::size_t n = 0; n < bench.readings; ++n) {
    if (n > 0) winding.carry_for(bench.interval_s);
    const bool reversed = !bench.one_polarity && n / turn % 2 == 1;
    double amps = reversed ? -bench.current_a : bench.current_a;
    if (bench.current_noise_a > 0) amps += bench.current_noise_a * random.normal();
    const double across = winding.resistance() * amps + bench.thermal_offset_v;
    volts.push_back(shown(across, bench.scale_v, bench.zero_v, bench.noise_v, bench.digit_v, random));
    const double seen = bench.shunt_ohm > 0 ? bench.shunt_ohm * amps : amps;
    second.push_back(shown(seen, bench.scale_a, bench.zero_a, bench.noise_a, bench.digit_a, random));
  }
  record.truth.r_dc_last_ohm = winding.resistance();
  record.truth.warming_k = winding.temperature() - first_degc;

  Capture& capture = record.capture;
  capture.dialect.format = "simulated";
  capture.time = {0, bench.interval_s, {}};
  const auto channel = [](std::string name, Unit unit, std::vector<double> samples, double digit) {
    Channel c;
    c.name = std::move(name);
    c.unit = unit;
    c.unit_stated = true;
    c.samples = std::move(samples);
    if (digit > 0) c.resolution = digit;
    return c;
  };
  capture.channels.push_back(channel("voltage", Unit::volt, std::move(volts), bench.digit_v));
  const bool shunt = bench.shunt_ohm > 0;
  capture.channels.push_back(channel(shunt ? "shunt" : "current", shunt ? Unit::volt : Unit::ampere, std::move(second), bench.digit_a));
  return record;
}

}  // namespace coilassay::synthetic

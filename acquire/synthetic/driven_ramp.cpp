#include "acquire/synthetic/driven_ramp.h"

#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <numbers>
#include <span>
#include <vector>

#include "acquire/synthetic/scope.h"
#include "base/digest.h"

namespace coilassay::synthetic {

namespace {

constexpr int kStepsOfDrive = 4000;
constexpr double kLongestDrive = 50;                        // times the drive an unsaturated coil without losses needs
constexpr std::size_t kMostSamples = std::size_t{1} << 26;

Result<void> refused(const std::string& finding, const std::string& remedy) {
  return failure(Problem::bad_number, "simulated ramp", finding, remedy);
}

Result<void> check(const DrivenRampBench& b) {
  enum class Rule { above_zero, not_negative, any };
  struct Item {
    const char* what;
    double value;
    Rule rule;
  };
  const Item items[] = {
      {"inductance", b.core.inductance_h, Rule::above_zero},
      {"saturated inductance", b.core.saturated_inductance_h, Rule::above_zero},
      {"knee current", b.core.knee_current_a, Rule::above_zero},
      {"exponent", b.core.exponent, Rule::above_zero},
      {"resistance", b.resistance_ohm, Rule::not_negative},
      {"core loss", b.core_loss_ohm, Rule::not_negative},
      {"ratio of the first pulse", b.first_pulse_ratio, Rule::above_zero},
      {"supply", b.supply_v, Rule::above_zero},
      {"switch resistance", b.switch_resistance_ohm, Rule::not_negative},
      {"bank capacitance", b.bank_capacitance_f, Rule::not_negative},
      {"current limit", b.current_limit_a, Rule::not_negative},
      {"peak current", b.peak_current_a, Rule::above_zero},
      {"drive time", b.drive_time_s, Rule::not_negative},
      {"diode voltage", b.diode_v, Rule::above_zero},
      {"rest", b.rest_ratio, Rule::not_negative},
      {"voltage offset", b.voltage_offset_v, Rule::any},
      {"voltage gain", b.voltage_gain, Rule::any},
      {"voltage noise", b.voltage_noise_v, Rule::not_negative},
      {"voltage full scale", b.voltage_full_scale_v, Rule::not_negative},
      {"shunt", b.shunt_ohm, Rule::not_negative},
      {"shunt inductance", b.shunt_inductance_h, Rule::not_negative},
      {"skew", b.skew_s, Rule::any},
      {"probe corner", b.probe_corner_hz, Rule::not_negative},
      {"current offset", b.current_offset_a, Rule::any},
      {"current gain", b.current_gain, Rule::any},
      {"current noise", b.current_noise_a, Rule::not_negative},
      {"current full scale", b.current_full_scale_a, Rule::not_negative},
      {"sample interval", b.sample_interval_s, Rule::not_negative},
      {"pre-trigger fraction", b.pretrigger_fraction, Rule::not_negative},
      {"time base error", b.timebase_error, Rule::any},
  };
  for (const Item& item : items) {
    const bool good = std::isfinite(item.value) && (item.rule == Rule::any || item.value > 0 ||
                                                    (item.rule == Rule::not_negative && item.value == 0));
    if (!good) return refused(fmt::format("the {} is {}, which no bench can have", item.what, item.value), "give a usual value");
  }
  if (b.core.saturated_inductance_h > b.core.inductance_h) {
    return refused("the saturated inductance exceeds the inductance at zero current", "give a smaller one");
  }
  if (b.pretrigger_fraction >= 0.95) return refused("hardly a sample is left after the trigger", "give less pre-trigger");
  if (std::fabs(b.timebase_error) >= 0.5) return refused("a time base off by half is no clock", "give a ratio such as 25 ppm");
  if (b.bits < 0 || b.bits > 24) return refused(fmt::format("a converter of {} bits", b.bits), "give 1 to 24 bits");
  if (b.samples < 16 || b.samples > kMostSamples) {
    return refused(fmt::format("a record of {} samples", b.samples), fmt::format("give 16 to {} samples", kMostSamples));
  }
  if (b.pulses < 1 || b.pulses > 1000) return refused("so many pulses are no test", "give 1 to 1000 pulses");
  if (b.pulses > 1 && !b.freewheel) return refused("between pulses the current has to fall", "add the freewheeling diode");
  if (b.shunt_ohm > 0 && b.probe_corner_hz > 0) return refused("a shunt and a current probe at once", "leave one of them out");
  if (b.shunt_inductance_h > 0 && b.shunt_ohm == 0) return refused("a shunt's inductance without a shunt", "give the shunt");
  return {};
}

/// Current in the coil, bank voltage, what a current probe has lost, and the integral of the squared coil voltage.
struct State {
  double current = 0, bank = 0, droop = 0, loss = 0;
};

enum class Phase { rest, drive, fall };

class Circuit {
 public:
  explicit Circuit(const DrivenRampBench& bench) : b_(bench), corner_(2 * std::numbers::pi * bench.probe_corner_hz) {}

  double ratio = 1;   // of the pulse at hand

  double inductance(double i) const { return ratio * b_.core.incremental(i); }

  /// Voltage over the coil (with its winding resistance).
  double coil_voltage(const State& s, Phase phase) const {
    if (phase == Phase::rest) return 0;
    if (phase == Phase::fall) return -b_.diode_v - b_.shunt_ohm * s.current;
    const double free = s.bank - (b_.switch_resistance_ohm + b_.shunt_ohm) * s.current;
    return limited(s) ? std::min(free, b_.resistance_ohm * s.current) : free;
  }
  bool limited(const State& s) const { return b_.current_limit_a > 0 && s.current >= b_.current_limit_a; }

  /// Less what the winding takes of the currents through the inductance and through the core's loss.
  double inner_voltage(const State& s, Phase phase) const {
    const double v = coil_voltage(s, phase) - b_.resistance_ohm * s.current;
    return b_.core_loss_ohm > 0 ? v / (1 + b_.resistance_ohm / b_.core_loss_ohm) : v;
  }
  double current_slope(const State& s, Phase phase) const { return inner_voltage(s, phase) / inductance(s.current); }
  /// What the sense element carries.
  double sensed(const State& s, Phase phase) const {
    return s.current + (b_.core_loss_ohm > 0 && phase != Phase::rest ? inner_voltage(s, phase) / b_.core_loss_ohm : 0);
  }

  State step(const State& s, Phase phase, double h) const {
    const State k1 = derivative(s, phase), k2 = derivative(moved(s, k1, h / 2), phase),
                k3 = derivative(moved(s, k2, h / 2), phase), k4 = derivative(moved(s, k3, h), phase);
    State next = s;
    next.current += h / 6 * (k1.current + 2 * k2.current + 2 * k3.current + k4.current);
    next.bank += h / 6 * (k1.bank + 2 * k2.bank + 2 * k3.bank + k4.bank);
    next.droop += h / 6 * (k1.droop + 2 * k2.droop + 2 * k3.droop + k4.droop);
    next.loss += h / 6 * (k1.loss + 2 * k2.loss + 2 * k3.loss + k4.loss);
    return next;
  }

 private:
  static State moved(const State& s, const State& k, double h) {
    return {s.current + h * k.current, s.bank + h * k.bank, s.droop + h * k.droop, s.loss + h * k.loss};
  }
  State derivative(const State& s, Phase phase) const {
    State d;
    if (phase != Phase::rest) d.current = current_slope(s, phase);
    if (phase == Phase::drive && b_.bank_capacitance_f > 0) d.bank = -s.current / b_.bank_capacitance_f;
    d.droop = corner_ * (s.current - s.droop);
    if (b_.core_loss_ohm > 0 && phase != Phase::rest) {
      const double v = inner_voltage(s, phase);
      d.loss = v * v / b_.core_loss_ohm;
    }
    return d;
  }

  const DrivenRampBench& b_;
  double corner_;
};

/// The circuit's own time line: what holds from when on.
struct Event {
  double time;
  Phase phase;
  State state;    // at that time
  double ratio;
};

struct TimeLine {
  std::vector<Event> events;
  double step = 0;         // at most, in s
  double end = 0;          // of the last pulse and its rest
  State at_peak;
  double drive_time = 0;
  double loss_of_pulse = std::nan("");
};

Result<double> time_to_peak(const DrivenRampBench& b, Circuit& circuit, double step) {
  State s{0, b.supply_v, 0, 0};
  double t = 0;
  const double longest = kLongestDrive * b.core.inductance_h * b.peak_current_a / b.supply_v;
  while (t < longest) {
    const State next = circuit.step(s, Phase::drive, step);
    if (next.current >= b.peak_current_a) {
      double low = 0, high = step;
      for (int i = 0; i < 60; ++i) {
        const double middle = (low + high) / 2;
        (circuit.step(s, Phase::drive, middle).current >= b.peak_current_a ? high : low) = middle;
      }
      return t + high;
    }
    s = next;
    t += step;
  }
  return failure(refused(fmt::format("the current never reaches {} A: it stands at {:.4g} A", b.peak_current_a, s.current),
                         "give a lower peak current, a drive time, a higher supply or less resistance"));
}

/// Every switching of the circuit, with the state there.
Result<TimeLine> time_line(const DrivenRampBench& b, Circuit& circuit) {
  TimeLine line;
  const double guess = b.core.inductance_h * b.peak_current_a / b.supply_v;
  line.step = (b.drive_time_s > 0 ? b.drive_time_s : guess) / kStepsOfDrive;
  line.drive_time = b.drive_time_s;
  if (line.drive_time == 0) {
    const Result<double> found = time_to_peak(b, circuit, line.step);
    if (!found) return failure(found);
    line.drive_time = *found;
    line.step = std::min(line.step, line.drive_time / kStepsOfDrive);
  }
  double t = 0, droop = 0;
  const auto run = [&](State s, Phase phase, double length) {
    const auto steps = static_cast<std::size_t>(std::ceil(length / line.step));
    for (std::size_t i = 0; i < steps; ++i) s = circuit.step(s, phase, length / static_cast<double>(steps));
    return s;
  };
  for (std::size_t pulse = 0; pulse < b.pulses; ++pulse) {
    circuit.ratio = pulse == 0 ? b.first_pulse_ratio : 1;
    State s{0, b.supply_v, droop, 0};
    line.events.push_back({t, Phase::drive, s, circuit.ratio});
    const double begin = t;
    s = run(s, Phase::drive, line.drive_time);
    t += line.drive_time;
    line.at_peak = s;
    line.events.push_back({t, Phase::fall, s, circuit.ratio});
    if (!b.freewheel) break;
    for (;;) {
      State next = circuit.step(s, Phase::fall, line.step);
      if (next.current > 0) {
        s = next;
        t += line.step;
        continue;
      }
      double low = 0, high = line.step;
      for (int i = 0; i < 60; ++i) {
        const double middle = (low + high) / 2;
        (circuit.step(s, Phase::fall, middle).current <= 0 ? high : low) = middle;
      }
      s = circuit.step(s, Phase::fall, high);
      t += high;
      break;
    }
    s.current = 0;
    line.loss_of_pulse = s.loss;
    line.events.push_back({t, Phase::rest, s, circuit.ratio});
    const double rest = b.rest_ratio * (t - begin);
    s = run(s, Phase::rest, rest);
    droop = s.droop;
    t += rest;
  }
  line.end = t;
  return line;
}

/// Walks along the time line: states at times that do not fall.
class Walker {
 public:
  Walker(const Circuit& circuit, const TimeLine& line) : circuit_(circuit), line_(line) {}

  State at(double t, Phase& phase) {
    if (t < 0) {
      phase = Phase::rest;
      return {};
    }
    while (next_ < line_.events.size() && line_.events[next_].time <= t) {
      const Event& event = line_.events[next_++];
      now_ = event.time;
      phase_ = event.phase;
      state_ = event.state;
      circuit_.ratio = event.ratio;
    }
    while (now_ < t) {
      const double h = std::min(line_.step, t - now_);
      state_ = circuit_.step(state_, phase_, h);
      now_ = h < line_.step ? t : now_ + h;
    }
    phase = phase_;
    return state_;
  }
  const Circuit& circuit() const { return circuit_; }

 private:
  Circuit circuit_;
  const TimeLine& line_;
  std::size_t next_ = 0;
  double now_ = 0;
  Phase phase_ = Phase::rest;
  State state_;
};

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

DrivenRampTruth truth_of(const DrivenRampBench& b, const TimeLine& line) {
  DrivenRampTruth truth{};
  truth.l_0_h = b.core.inductance_h;
  for (std::size_t d = 0; d < truth.i_sat_a.size(); ++d) {
    const double drop = 0.1 * static_cast<double>(d + 1);
    truth.i_sat_a[d] = b.core.current_at_drop(drop);
    truth.i_sat_secant_a[d] = b.core.current_at_secant_drop(drop);
  }
  truth.r_dc_ohm = b.resistance_ohm;
  truth.peak_current_a = line.at_peak.current;
  truth.peak_flux_wb = b.core.flux(truth.peak_current_a);
  // Energy is i flux less the integral of the flux over i.
  constexpr int kPanels = 400;
  const double h = truth.peak_current_a / kPanels;
  const auto work = [&](double i) { return i * b.core.incremental(i); };
  for (int p = 0; p < kPanels; ++p) {
    truth.peak_energy_j += h / 6 * (work(h * p) + 4 * work(h * (p + 0.5)) + work(h * (p + 1)));
  }
  truth.drive_time_s = line.drive_time;
  truth.w_loop_j = line.loss_of_pulse;
  return truth;
}

}  // namespace

Result<DrivenRampRecord> simulate_driven_ramp(const DrivenRampBench& b) {
  if (const auto good = check(b); !good) return failure(good);
  Circuit circuit(b);
  Result<TimeLine> line = time_line(b, circuit);
  if (!line) return failure(line);

  Timebase timebase;
  timebase.samples = b.samples;
  timebase.before = static_cast<std::size_t>(std::lround(b.pretrigger_fraction * static_cast<double>(b.samples)));
  timebase.error = b.timebase_error;
  timebase.interval_s = b.sample_interval_s;
  const double after = static_cast<double>(b.samples - timebase.before);
  if (timebase.interval_s == 0) timebase.interval_s = line->end / (1 + b.timebase_error) / after;

  std::vector<double> volts(b.samples), amps(b.samples);
  Walker for_volts(circuit, *line), for_amps(circuit, *line);
  for (std::size_t n = 0; n < b.samples; ++n) {
    const double t = timebase.true_time_s(n);
    Phase phase = Phase::rest;
    const State s = for_volts.at(t, phase);
    volts[n] = for_volts.circuit().coil_voltage(s, phase);
    if (b.voltage_at_supply && phase == Phase::drive) volts[n] = s.bank;
    Phase sensed_phase = Phase::rest;
    const State late = for_amps.at(t - b.skew_s, sensed_phase);
    double i = for_amps.circuit().sensed(late, sensed_phase) - (b.probe_corner_hz > 0 ? late.droop : 0);
    if (b.shunt_ohm > 0) {
      const double slope = sensed_phase == Phase::rest ? 0 : for_amps.circuit().current_slope(late, sensed_phase);
      i += b.shunt_inductance_h / b.shunt_ohm * slope;
    }
    amps[n] = i;
  }
  DrivenRampRecord record;
  record.truth = truth_of(b, *line);
  record.capture.time = timebase.axis();
  Random voltage_noise(b.seed, 0), current_noise(b.seed, 1);
  record.capture.channels.push_back(
      seen_through({b.voltage_gain, b.voltage_offset_v, b.voltage_noise_v, b.bits, b.voltage_full_scale_v}, "CH1", Unit::volt,
                   std::move(volts), voltage_noise));
  const double ohm = b.shunt_ohm > 0 ? b.shunt_ohm : 1;   // a shunt shows volts
  record.capture.channels.push_back(seen_through({b.current_gain * ohm, b.current_offset_a * ohm, b.current_noise_a * ohm,
                                                  b.bits, b.current_full_scale_a * ohm},
                                                 "CH2", b.shunt_ohm > 0 ? Unit::volt : Unit::ampere, std::move(amps),
                                                 current_noise));
  for (std::size_t i = 0; i < record.capture.channels.size(); ++i) record.capture.channels[i].column = i + 2;
  for (const Channel& channel : record.capture.channels) {
    if (!std::all_of(channel.samples.begin(), channel.samples.end(), [](double v) { return std::isfinite(v); })) {
      return failure(refused("the samples of this bench are beyond what a number can hold", "give usual values"));
    }
  }
  record.capture.source = source_of(record.capture.channels);
  return record;
}

}  // namespace coilassay::synthetic

#include "analysis/ramp_flux.h"

#include <algorithm>
#include <cmath>

#include "analysis/ramp.h"

namespace coilassay {

std::vector<double> PulseIntegrals::flux(double resistance_ohm) const {
  std::vector<double> out(volt_seconds.size());
  for (std::size_t k = 0; k < out.size(); ++k) out[k] = volt_seconds[k] - resistance_ohm * charge[k];
  return out;
}

PulseIntegrals integrals_of(const RampLayout& layout, const RampPulse& pulse) {
  PulseIntegrals out;
  out.first = pulse.start > 0 ? pulse.start - 1 : 0;
  const std::size_t end = std::max(pulse.end, pulse.peak);
  out.volt_seconds.resize(end - out.first);
  out.charge.resize(end - out.first);
  const double half = layout.step_s / 2;
  double flux = 0, charge = 0;
  for (std::size_t k = 1; k < out.charge.size(); ++k) {
    const std::size_t i = out.first + k;
    flux += half * (layout.volts[i - 1] + layout.volts[i]);
    charge += half * (layout.amps[i - 1] + layout.amps[i]);
    out.volt_seconds[k] = flux;
    out.charge[k] = charge;
  }
  return out;
}

namespace {

/// Resistance that closes the flux of one pulse, with its standard uncertainty.
struct Closure {
  double ohm, u_ohm;
};
Closure closure_of(const RampLayout& layout, const RampPulse& pulse, const PulseIntegrals& integrals) {
  const double charge = integrals.charge.back(), flux = integrals.volt_seconds.back();
  const auto samples = static_cast<double>(integrals.charge.size());
  // Inductance from the rise tells how much flux the current that is left still holds.
  const std::size_t peak = pulse.peak - 1 - integrals.first;
  const double apparent = integrals.volt_seconds[peak] / layout.amps[pulse.peak - 1];
  double left = 0;
  const std::size_t look = std::min<std::size_t>(16, layout.amps.size() - pulse.end + 1);
  for (std::size_t k = 0; k < look; ++k) left += layout.amps[pulse.end - 1 + k] / static_cast<double>(look);
  Closure closure{};
  closure.ohm = (flux - apparent * (left - pulse.start_a)) / charge;
  const double noise = layout.volt_noise * layout.step_s * std::sqrt(samples);
  const double zero = layout.volt_zero_u * layout.step_s * samples;
  // Each edge is known to one sample: the start, the end of the drive and the end of the fall.
  const double edges = 1.5 * pulse.edge_v * layout.step_s / std::sqrt(12.0) * std::sqrt(2.0);
  const double end = apparent * (std::fabs(left) / 2 + layout.amp_noise / std::sqrt(static_cast<double>(look)));
  const double amp_zero = closure.ohm * layout.amp_zero_u * layout.step_s * samples;
  closure.u_ohm = std::sqrt(noise * noise + zero * zero + edges * edges + end * end + amp_zero * amp_zero) / charge;
  return closure;
}

}  // namespace

RampResistance resistance_of(const RampLayout& layout, const std::vector<PulseIntegrals>& integrals, const BenchSetup& bench,
                             const PropagationOptions& options) {
  RampResistance result;
  result.closure_u_ohm = std::nan("");
  double weight = 0, sum = 0;
  for (std::size_t p = 0; p < layout.pulses.size(); ++p) {
    if (!layout.pulses[p].returns || !layout.zero_known) continue;
    const Closure closure = closure_of(layout, layout.pulses[p], integrals[p]);
    const double w = 1 / (closure.u_ohm * closure.u_ohm);
    sum += w * closure.ohm;
    weight += w;
  }
  if (weight > 0) {
    result.closure_ohm = sum / weight;
    result.closure_u_ohm = 1 / std::sqrt(weight);
  }
  InputError& error = result.error;
  if (bench.winding_resistance) {
    result.from = RampResistance::From::stated;
    error = input_error("winding resistance", *bench.winding_resistance,
                        {ramp_defaults::kResistanceRatio * std::fabs(bench.winding_resistance->value),
                         "±10 %, a winding 25 K from where it was measured"},
                        options);
    error.common = false;
    return result;
  }
  error.source = "winding resistance";
  error.common = false;
  const double drop = layout.pulses.front().drive_v / layout.peak_a;   // all of the voltage
  if (weight > 0 && result.closure_u_ohm < 0.1 * drop && result.closure_ohm > -2 * result.closure_u_ohm) {
    result.from = RampResistance::From::closure;
    error.value = std::fmax(result.closure_ohm, 0);
    error.kind = 'A';
    error.basis = "data: the flux returns to its start";
    error.law = {ErrorLaw::Kind::normal, result.closure_u_ohm, 0};
    return result;
  }
  // Also under --exact-bench: without a resistance there is no flux, and none was stated.
  error.value = ramp_defaults::kUnknownDropRatio * drop;
  error.basis = "default: unknown, between nothing and 5 % of the voltage at the peak current";
  error.law = {ErrorLaw::Kind::rectangular, error.value / std::sqrt(3.0), 0};
  return result;
}

}  // namespace coilassay

#include "analysis/ring_down_circuit.h"

#include <cmath>

#include "analysis/ring_down.h"
#include "base/number_text.h"

namespace coilassay {

namespace defaults = ring_down_defaults;

RingDownCircuit::RingDownCircuit(const BenchSetup& bench, const PropagationOptions& options, bool loads)
    : options_(options) {
  // A stated time base is a tolerance around no error: "25 ppm" is the half-width.
  if (bench.timebase) {
    InputError input = input_error("time base", *bench.timebase, {}, options);
    const double half = bench.timebase->law == Law::unstated ? bench.timebase->value : 0;
    input.value = 0;
    input.basis = "stated";
    if (half > 0) input.law = {ErrorLaw::Kind::rectangular, half / std::sqrt(3.0), 0};
    timebase_ = add(std::move(input));
  } else {
    timebase_ = add(input_error("time base", StatedValue::unstated(0, Unit::one),
                                {defaults::kTimebaseRatio, "±100 ppm, a poor crystal"}, options));
  }
  if (!loads) return;

  const ChannelSetup& probe = bench.voltage;
  if (probe.input_capacitance) {
    probe_c_ = add(input_error("probe capacitance", *probe.input_capacitance,
                               {defaults::kStatedCapacitanceRatio * probe.input_capacitance->value, "±20 %"}, options));
  } else {
    probe_c_ = add(input_error("probe capacitance", StatedValue::unstated(0, Unit::farad),
                               {defaults::kProbeCapacitance_f, "not stated, up to 20 pF"}, options));
  }
  if (probe.input_resistance) {
    probe_r_ = add_resistance("probe resistance", *probe.input_resistance, options);
  } else {
    probe_g_ = add(input_error("probe resistance", StatedValue::unstated(0, Unit::siemens),
                               {defaults::kProbeConductance_s, "not stated, down to 1 Mohm"}, options));
  }
  if (bench.across_resistance) across_r_ = add_resistance("resistance across", *bench.across_resistance, options);
  if (bench.across_capacitance) {
    across_c_ = add(input_error("capacitance across", *bench.across_capacitance,
                                {defaults::kStatedCapacitanceRatio * bench.across_capacitance->value, "±20 %"}, options));
  }
}

std::size_t RingDownCircuit::add(InputError input) {
  inputs_.push_back(std::move(input));
  return inputs_.size() - 1;
}

std::size_t RingDownCircuit::add_resistance(const std::string& source, const StatedValue& stated,
                                            const PropagationOptions& options) {
  return add(input_error(source, stated, {defaults::kStatedResistanceRatio * stated.value, "±5 %"}, options));
}

std::size_t RingDownCircuit::add_capacitor(const CapacitorSetup& capacitor, const std::string& name) {
  capacitor_.push_back(add(input_error(name, capacitor.value,
                                       {defaults::kCapacitorRatio * capacitor.value.value,
                                        "±5 %, the usual grade of film capacitors"},
                                       options_)));
  if (capacitor.dissipation_factor) {
    dissipation_.push_back(add(input_error("dissipation of " + name, *capacitor.dissipation_factor,
                                           {0.5 * capacitor.dissipation_factor->value, "±50 %"}, options_)));
  } else {
    dissipation_.push_back(add(input_error("dissipation of " + name, StatedValue::unstated(0, Unit::one),
                                           {defaults::kDissipation, "not stated, up to 0.001"}, options_)));
  }
  return capacitor_.size() - 1;
}

double RingDownCircuit::stray_capacitance(std::span<const double> x) const {
  double c = 0;
  if (probe_c_ != kNone) c += x[probe_c_];
  if (across_c_ != kNone) c += x[across_c_];
  return c;
}

double RingDownCircuit::total_capacitance(std::span<const double> x, std::size_t capacitor) const {
  return x[capacitor_[capacitor]] + stray_capacitance(x);
}

double RingDownCircuit::conductance(std::span<const double> x) const {
  double g = 0;
  if (probe_r_ != kNone) g += 1 / x[probe_r_];
  if (probe_g_ != kNone) g += x[probe_g_];
  if (across_r_ != kNone) g += 1 / x[across_r_];
  return g;
}

double RingDownCircuit::dissipation(std::span<const double> x, std::size_t capacitor) const {
  return x[dissipation_[capacitor]];
}

std::vector<Correction> RingDownCircuit::corrections() const {
  std::vector<Correction> list;
  const auto name_it = [&](std::size_t input, Unit unit) {
    if (input != kNone && inputs_[input].value != 0) list.push_back({inputs_[input].source, inputs_[input].value, unit});
  };
  name_it(probe_c_, Unit::farad);
  name_it(probe_r_, Unit::ohm);
  name_it(across_r_, Unit::ohm);
  name_it(across_c_, Unit::farad);
  for (const std::size_t d : dissipation_) name_it(d, Unit::one);
  return list;
}

CoilOfDecay coil_of_decay(double omega0, double alpha, double capacitance_f, double conductance_s, double dissipation) {
  const double coil_rate = 2 * alpha - conductance_s / capacitance_f - omega0 * dissipation;  // R_s / L
  const double inductance = 1 / (omega0 * omega0 * capacitance_f - coil_rate * conductance_s);
  return {inductance, coil_rate * inductance};
}

}  // namespace coilassay

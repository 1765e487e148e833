#include "analysis/sweep_circuit.h"

#include <algorithm>
#include <cmath>
#include <string>

namespace coilassay {

std::optional<Circuit> circuit_of(const Measurement& m) {
  if (m.test != "sweep" || !m.model || m.find("L") == nullptr) return std::nullopt;
  const auto& named = m.model->parameters;
  const auto value_of = [&](std::string_view key) -> std::optional<double> {
    const auto at = named.find(std::string(key));
    return at == named.end() ? std::nullopt : std::optional(at->second.value);
  };
  Circuit circuit;
  circuit.reference_hz = value_of("f_ref").value_or(1);
  const auto has = [&](CircuitParameter p) { return value_of(name(p)).has_value(); };
  circuit.family = {.parallel_loss = has(CircuitParameter::parallel_conductance),
                    .skin = has(CircuitParameter::skin_resistance),
                    .relaxation = has(CircuitParameter::relaxation_resistance),
                    .second_resonance = has(CircuitParameter::second_capacitance)};
  for (const CircuitParameter p : parameters_of(circuit.family)) {
    const auto value = value_of(name(p));
    if (!value) return std::nullopt;
    circuit[p] = *value;
  }
  return circuit;
}

Sweep swept(const Circuit& circuit, const Sweep& like) {
  Sweep made;
  made.ports = 1;
  made.as_read = std::string(1, 'Z');   // GCC 12 warns of an overlap in the assignment of one letter
  if (!like.reference_ohm.empty()) made.reference_ohm = {like.reference_ohm.front()};
  for (const double f : like.frequency_hz) {
    if (std::isfinite(f) && f > 0) made.frequency_hz.push_back(f);
  }
  std::sort(made.frequency_hz.begin(), made.frequency_hz.end());
  made.frequency_hz.erase(std::unique(made.frequency_hz.begin(), made.frequency_hz.end()), made.frequency_hz.end());
  for (const double f : made.frequency_hz) {
    made.z_ohm.push_back({impedance(circuit, f)});
    made.bad.push_back(false);
  }
  return made;
}

}  // namespace coilassay

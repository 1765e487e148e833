#include "analysis/ring_down.h"

#include <cmath>
#include <numbers>
#include <utility>

#include "analysis/ring_down_circuit.h"
#include "analysis/ring_down_decay.h"
#include "analysis/ring_down_result.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

constexpr double kTwoPi = 2 * std::numbers::pi;

/// What the decay alone tells: f_0, f_d, alpha, Q.
void add_circuit(Measurement& result, const CaptureDecay& decay, const RingDownCircuit& circuit, const DecayErrors& errors,
                 const RingDownRequest& request) {
  std::vector<OutputSpec> outputs{{"f_0"}, {"alpha"}, {"Q", true}};
  if (decay.q() > 0) outputs.push_back({"f_d"});
  const auto f = [&](std::span<const double> x, std::span<double> y) {
    const DecayRates rates = errors.rates(x, circuit);
    y[0] = rates.omega0 / kTwoPi;
    y[1] = rates.alpha;
    y[2] = 2 * rates.alpha / rates.omega0;
    if (y.size() > 3) y[3] = rates.damped > 0 ? rates.damped / kTwoPi : std::nan("");
  };
  add_estimates(result, circuit.inputs(), errors.fitted(decay), outputs, f, {}, request.propagation);
}

/// With one capacitor: L_s, R_s, Q_coil.
void add_coil(Measurement& result, const CaptureDecay& decay, const RingDownCircuit& circuit, const DecayErrors& errors,
              double f_0, const RingDownRequest& request) {
  const std::vector<OutputSpec> outputs{{"L_s", false, f_0}, {"R_s", false, f_0}, {"Q_coil", true, f_0}};
  const auto f = [&](std::span<const double> x, std::span<double> y) {
    const DecayRates rates = errors.rates(x, circuit);
    const CoilOfDecay coil = coil_of_decay(rates.omega0, rates.alpha, circuit.total_capacitance(x, 0), circuit.conductance(x),
                                           circuit.dissipation(x, 0));
    y[0] = coil.inductance_h > 0 ? coil.inductance_h : std::nan("");
    y[1] = coil.resistance_ohm;
    y[2] = coil.resistance_ohm / (rates.omega0 * coil.inductance_h);
  };
  add_estimates(result, circuit.inputs(), errors.fitted(decay), outputs, f, {}, request.propagation);
}

/// Without a capacitor: what the coil would be with usual ones, and which to try.
void advise_capacitor(Measurement& result, double omega0) {
  std::string sentence = "without --capacitor the inductance stays open; this frequency means";
  const std::pair<double, const char*> usual[] = {{1e-9, "1 nF"}, {10e-9, "10 nF"}, {100e-9, "100 nF"}};
  for (const auto& [farad, words] : usual) {
    sentence += (farad == 1e-9 ? " " : farad == 10e-9 ? ", " : " or ") +
                to_text(1 / (omega0 * omega0 * farad), Unit::henry, Script::utf8, 3) + " with " + words;
  }
  result.advice.push_back(sentence);
  result.advice.push_back(
      "put a known capacitor across the coil (10 nF film suits most coils from 1 µH to 10 mH) and give it with --capacitor "
      "10nF±1%; two or more captures with different capacitors also give the coil's own capacitance");
}

}  // namespace

Result<Measurement> measure_ring_down(const Capture& capture, const RingDownRequest& request) {
  const std::size_t capacitors = request.bench.capacitors.size();
  if (capacitors > 1) {
    return failure(Problem::usage, "--capacitor",
                   std::to_string(capacitors) + " capacitors were given for one capture",
                   "give one capture per capacitor, in the same order");
  }
  Result<CaptureDecay> decay = decay_of_capture(capture, request);
  if (!decay) return failure(decay);

  Measurement result;
  describe_source(result, capture, request);
  result.findings = decay->findings;
  if (request.traces) add_traces(result, *decay);
  if (!decay->decay) return result;

  RingDownCircuit circuit(request.bench, request.propagation, capacitors > 0);
  if (capacitors > 0) circuit.add_capacitor(request.bench.capacitors.front(), "capacitor");
  const DecayErrors errors(circuit, *decay, "");
  add_circuit(result, *decay, circuit, errors, request);
  result.model = model_of(*decay);
  const Estimate* f_0 = result.find("f_0");
  if (f_0 == nullptr) return result;
  const double omega0 = kTwoPi * f_0->quantity.value;
  result.conditions.frequency_hz = f_0->quantity.value;
  note_damping(result);

  if (capacitors == 0) {
    advise_capacitor(result, omega0);
    add_release_level(result, *decay, circuit);
    return result;
  }
  result.corrections = circuit.corrections();
  add_coil(result, *decay, circuit, errors, f_0->quantity.value, request);
  withhold_unresolved(result);
  note_loads(result, circuit, request);
  add_release_level(result, *decay, circuit);
  return result;
}

}  // namespace coilassay

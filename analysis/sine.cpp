#include "analysis/sine.h"

#include <cmath>
#include <numbers>
#include <utility>

#include "analysis/cautions.h"
#include "analysis/sine_record.h"
#include "analysis/sine_result.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kWindingRatio = 0.05;   // of a winding resistance given without tolerance

void describe_source(Measurement& result, const Capture& capture, const SineRequest& request) {
  result.test = "sine";
  result.sources.push_back({capture.source, capture.samples(), capture.time.step_s});
  result.equipment = request.bench.equipment;
  const auto stated = [](const std::optional<StatedValue>& value) {
    return value ? std::optional<double>(value->value) : std::nullopt;
  };
  result.conditions.level_v = stated(request.bench.level);
  result.conditions.bias_a = stated(request.bench.bias);
  result.conditions.temperature_degc = stated(request.bench.temperature);
}

/// Everything that follows from the two phasors.
void add_impedance(Measurement& result, SineInputs& inputs, const SineRequest& request) {
  const SineInputs::Draw best = inputs.draw(inputs.best());
  const double f = best.omega / kTwoPi;
  std::vector<OutputSpec> outputs{{"f"},          {"Z", false, f},   {"phi", false, f}, {"R_s", false, f},
                                  {"X_s", false, f}, {"L_s", false, f}, {"R_p", true, f},  {"L_p", false, f},
                                  {"Q", true, f},    {"D", false, f},   {"P", false, f}};
  const std::optional<StatedValue>& dcr = request.bench.winding_resistance;
  const std::size_t winding = inputs.errors().size();
  if (dcr) {
    inputs.errors().push_back(input_error("winding resistance", *dcr, {kWindingRatio * dcr->value, "±5 %"},
                                          request.propagation));
    outputs.push_back({"P_winding", false, f});
  }
  const auto function = [&inputs, winding](std::span<const double> x, std::span<double> y) {
    const SineInputs::Draw d = inputs.draw(x);
    const std::complex<double> z = d.volts / d.amps;
    const double r = z.real(), reactance = z.imag();
    const bool coil = reactance > 0;
    y[0] = d.omega / kTwoPi;
    y[1] = std::abs(z);
    y[2] = std::arg(z);
    y[3] = r;
    y[4] = reactance;
    y[5] = coil ? reactance / d.omega : std::nan("");
    y[6] = r / std::norm(z);                                         // 1/R_p
    y[7] = coil ? std::norm(z) / (reactance * d.omega) : std::nan("");
    y[8] = y[9] = r / std::fabs(reactance);                          // 1/Q, D
    y[10] = std::norm(d.amps) / 2 * r;
    if (y.size() > 11) y[11] = std::norm(d.amps) / 2 * x[winding];
  };
  add_estimates(result, inputs.errors(), inputs.fitted(), outputs, function, {}, request.propagation);
}

void add_cautions(Measurement& result, const SineInputs::Draw& best, const SineRequest& request) {
  SineLoad load;
  load.peak_v = std::abs(best.volts);
  load.peak_a = std::abs(best.amps);
  if (const Estimate* l = result.find("L_s")) load.energy_j = l->quantity.value * load.peak_a * load.peak_a / 2;
  const BenchSetup& bench = request.bench;
  if (bench.current.shunt) {
    load.shunt_w = load.peak_a * load.peak_a / 2 * bench.current.shunt->value;
    load.shares_earth = !bench.voltage.low_column && !bench.current.low_column;
  }
  for (Caution& caution : sine_cautions(load)) result.cautions.push_back(std::move(caution));
}

}  // namespace

Result<Measurement> measure_sine(const Capture& capture, const SineRequest& request) {
  Result<SineRecord> sine = sine_of_capture(capture, request);
  if (!sine) return failure(sine);
  Measurement result;
  describe_source(result, capture, request);
  result.findings = sine->findings;
  result.corrections = sine->record.corrections;
  if (request.traces) add_sine_traces(result, *sine);
  if (!sine->fit) return result;

  SineInputs inputs(*sine);
  const SineInputs::Draw best = inputs.draw(inputs.best());
  result.conditions.frequency_hz = best.omega / kTwoPi;
  result.conditions.level_a = std::abs(best.amps) / std::sqrt(2.0);
  result.conditions.peak_current_a = std::abs(best.amps);
  if (!result.conditions.level_v) result.conditions.level_v = std::abs(best.volts) / std::sqrt(2.0);
  result.model = model_of(*sine, inputs);
  add_impedance(result, inputs, request);
  judge_impedance(result, *sine, inputs, request);
  add_cautions(result, best, request);
  if (request.turns_ratio) {
    result.advice.push_back("the voltage is that of a sense winding: R_s and P are the core's, without the winding's resistance and "
                            "the flux that does not pass the sense winding");
  }
  const auto ceiling = result.model->parameters.find("q_ceiling");
  if (ceiling != result.model->parameters.end() && !result.has_finding("skew_limited")) {
    result.advice.push_back("with this knowledge of skew and shunt inductance R_s is good to 10 % up to Q " +
                            to_text(ceiling->second.value, Unit::one, Script::utf8, 2) + " at this frequency");
  }
  return result;
}

}  // namespace coilassay

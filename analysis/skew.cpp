#include "analysis/skew.h"

#include <cmath>
#include <numbers>
#include <utility>

#include "analysis/sine_record.h"
#include "analysis/sine_result.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kResistorRatio = 0.01;         // of a resistor given without tolerance
constexpr double kResistorInductance_h = 10e-9;  // of a small film resistor with its leads
constexpr double kStatedInductanceRatio = 0.5;
constexpr double kReactive = 0.3;               // rad: no resistor at this frequency

}  // namespace

Result<Measurement> measure_skew(const Capture& capture, const SkewRequest& request) {
  SineRequest plain = request.sine;
  plain.bench.current.skew = StatedValue::exact(0, Unit::second);
  Result<SineRecord> sine = sine_of_capture(capture, plain);
  if (!sine) return failure(sine);
  Measurement result;
  result.test = "sine";
  result.sources.push_back({capture.source, capture.samples(), capture.time.step_s});
  result.equipment = plain.bench.equipment;
  result.findings = sine->findings;
  result.corrections = sine->record.corrections;
  if (plain.traces) add_sine_traces(result, *sine);
  if (!sine->fit) return result;

  SineInputs inputs(*sine);
  const std::size_t at = inputs.errors().size();
  inputs.errors().push_back(input_error("resistor", request.resistor,
                                        {kResistorRatio * request.resistor.value, "±1 %"}, plain.propagation));
  inputs.errors().push_back(
      request.inductance
          ? input_error("resistor inductance", *request.inductance,
                        {kStatedInductanceRatio * std::fabs(request.inductance->value), "±50 %"}, plain.propagation)
          : input_error("resistor inductance", StatedValue::unstated(0, Unit::henry),
                        {kResistorInductance_h, "not stated, up to 10 nH"}, plain.propagation));
  const SineInputs::Draw best = inputs.draw(inputs.best());
  const double f = best.omega / kTwoPi;
  result.conditions.frequency_hz = f;
  result.conditions.level_a = std::abs(best.amps) / std::sqrt(2.0);
  result.model = model_of(*sine, inputs);
  const auto function = [&](std::span<const double> x, std::span<double> y) {
    const SineInputs::Draw d = inputs.draw(x, false);
    const std::complex<double> z = d.volts / d.amps;
    // One argument of a quotient: no jump at half a turn.
    const std::complex<double> beyond = z / std::complex(x[at], d.omega * x[at + 1]);
    y[0] = d.omega / kTwoPi;
    y[1] = std::abs(z);
    y[2] = std::arg(beyond) / d.omega;
  };
  add_estimates(result, inputs.errors(), inputs.fitted(), {{"f"}, {"Z", false, f}, {"skew", false, f}}, function, {},
                plain.propagation);

  const Estimate* z = result.find("Z");
  const Estimate* skew = result.find("skew");
  if (z == nullptr || skew == nullptr) return result;
  const double off = z->quantity.value / request.resistor.value - 1;
  const double tolerance = request.resistor.law == Law::unstated ? kResistorRatio / std::sqrt(3.0)
                                                                 : request.resistor.standard_uncertainty / request.resistor.value;
  const double u = std::hypot(z->quantity.standard_uncertainty / z->quantity.value, tolerance);
  if (std::fabs(off) > 3 * u) {
    result.findings.push_back({"resistor_differs", Severity::caution,
                               "the impedance is " + to_percent_text(std::fabs(off)) + (off > 0 ? " above" : " below") +
                                   " the stated resistor: check its value, the shunt and the gains before the skew is used",
                               "Z", off, Unit::one});
  }
  const double phase = skew->quantity.value * best.omega;
  if (std::fabs(phase) > kReactive) {
    result.findings.push_back({"channels_suspect", Severity::caution,
                               "the channels are " + to_text(phase, Unit::radian, Script::utf8, 2) +
                                   " apart, far for two inputs: is this the resistor, and not the coil?",
                               "skew", phase, Unit::radian});
  }
  return result;
}

}  // namespace coilassay

#include "analysis/resistance.h"

#include <algorithm>
#include <cmath>
#include <utility>

#include "analysis/resistance_line.h"
#include "analysis/resistance_readings.h"
#include "analysis/resistance_result.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

namespace defaults = resistance_defaults;

constexpr double kReference_degc = 20;

/// The errors of the readings, and the resistance they make of the fitted slope.
class ReadingErrors {
 public:
  ReadingErrors(const ResistanceReadings& readings, const ResistanceLine& line, const ResistanceRequest& request)
      : half_swing_a_(line.half_swing_a) {
    volt_gain_ = add(readings.voltage_gain);
    amp_gain_ = add(readings.current_gain);
    // Where the scatter is smaller than the last digit, that digit is not averaged out.
    const double scatter_v = line.residual_v, scatter_a = scatter_v / std::fabs(line.resistance_ohm);
    if (readings.volt_step > 2 * scatter_v) volt_ = seen("last digit of the voltage", readings.volt_step / 2);
    if (readings.amp_step > 2 * scatter_a) amp_ = seen("last digit of the current", readings.amp_step / 2);
    if (line.drifts) {
      warming_ = seen("warming while reading", line.drift_half_width_ohm);
    }
    if (line.both_sides || request.propagation.exact_bench) return;
    allow("thermal offset", thermal_, defaults::kThermalOffset_v, "one polarity, joints of unlike metals: ±10 µV");
    if (readings.from_scope) {
      allow("zero of the voltage channel", volt_zero_, defaults::kScopeZeroRatio * largest(readings.volts),
            "one polarity, an oscilloscope: ±2 % of the reading");
      allow("zero of the current channel", amp_zero_, defaults::kScopeZeroRatio * largest(readings.amps),
            "one polarity, an oscilloscope: ±2 % of the reading");
    } else {
      if (readings.volt_step > 0) {
        allow("zero of the voltmeter", volt_zero_, defaults::kZeroSteps * readings.volt_step,
              "one polarity, a meter: ±2 of its last digit");
      }
      if (readings.amp_step > 0) {
        allow("zero of the ammeter", amp_zero_, defaults::kZeroSteps * readings.amp_step,
              "one polarity, a meter: ±2 of its last digit");
      }
    }
  }

  const std::vector<InputError>& inputs() const { return inputs_; }
  std::size_t add(InputError input) {
    inputs_.push_back(std::move(input));
    return inputs_.size() - 1;
  }

  /// x: the inputs, then the fitted slope.
  double resistance(std::span<const double> x) const {
    const auto at = [&](std::optional<std::size_t> i) { return i ? x[*i] : 0; };
    const double slope = x[inputs_.size()];
    const double volts = at(volt_) + at(thermal_) + at(volt_zero_);
    const double amps = at(amp_) + at(amp_zero_);
    return x[volt_gain_] / x[amp_gain_] * (slope + (volts - slope * amps) / half_swing_a_ + at(warming_));
  }

 private:
  static double largest(const std::vector<double>& values) {
    double most = 0;
    for (const double v : values) most = std::fmax(most, std::fabs(v));
    return most;
  }
  std::size_t seen(const std::string& source, double half_width) {
    InputError input;
    input.source = source;
    input.law = {ErrorLaw::Kind::rectangular, half_width / std::sqrt(3.0), 0};
    input.kind = 'A';
    input.common = false;
    input.basis = "data";
    return add(std::move(input));
  }
  void allow(const std::string& source, std::optional<std::size_t>& place, double half_width, const std::string& why) {
    InputError input;
    input.source = source;
    input.law = {ErrorLaw::Kind::rectangular, half_width / std::sqrt(3.0), 0};
    input.basis = "default: " + why;
    place = add(std::move(input));
  }

  double half_swing_a_;
  std::vector<InputError> inputs_;
  std::size_t volt_gain_ = 0, amp_gain_ = 0;
  std::optional<std::size_t> volt_, amp_, warming_, thermal_, volt_zero_, amp_zero_;
};

InputError temperature_error(std::string source, const StatedValue& temperature, const PropagationOptions& options) {
  return input_error(std::move(source), temperature,
                     {defaults::kTemperature_k, "±2 K, a room's thermometer and a coil nearly as warm"}, options);
}

InputError coefficient_error(const WindingMetal& metal, const PropagationOptions& options) {
  return input_error("temperature coefficient", metal.coefficient,
                     {defaults::kCoefficientRatio * metal.coefficient.value, "±1 %, purity and drawing of the wire"}, options);
}

FittedInputs slope_of(const ResistanceLine& line) {
  FittedInputs fitted;
  fitted.source = "scatter of the readings";
  fitted.values = Eigen::VectorXd::Constant(1, line.resistance_ohm);
  fitted.covariance = Eigen::MatrixXd::Constant(1, 1, line.u_ohm * line.u_ohm);
  if (line.dof > 0 && line.dof < 200) fitted.dof = line.dof;
  return fitted;
}

/// R_dc, and R_dc_20 when the winding's temperature is known.
void add_resistance(Measurement& result, ReadingErrors errors, const ResistanceLine& line, const ResistanceRequest& request) {
  std::vector<OutputSpec> outputs{{"R_dc"}};
  std::size_t temperature = 0, coefficient = 0;
  if (request.bench.temperature && !request.cold) {
    temperature = errors.add(temperature_error("temperature of the coil", *request.bench.temperature, request.propagation));
    coefficient = errors.add(coefficient_error(request.metal, request.propagation));
    outputs.push_back({"R_dc_20"});
  }
  const auto f = [&](std::span<const double> x, std::span<double> y) {
    y[0] = errors.resistance(x);
    if (y.size() > 1) y[1] = y[0] / (1 + x[coefficient] * (x[temperature] - kReference_degc));
  };
  add_estimates(result, errors.inputs(), slope_of(line), outputs, f, {}, request.propagation);
}

/// The hot winding against the cold one.
void add_rise(Measurement& result, ReadingErrors errors, const ResistanceLine& line, const ResistanceRequest& request) {
  const std::size_t cold =
      errors.add(input_error("cold resistance", request.cold->resistance,
                             {defaults::kColdRatio * request.cold->resistance.value, "±1 %"}, request.propagation));
  const std::size_t start =
      errors.add(temperature_error("temperature of the cold winding", request.cold->temperature, request.propagation));
  const std::optional<std::size_t> air =
      request.bench.temperature
          ? std::optional(errors.add(temperature_error("temperature of the air", *request.bench.temperature, request.propagation)))
          : std::nullopt;
  const double constant = request.metal.rise_constant;
  const auto f = [&](std::span<const double> x, std::span<double> y) {
    const double warmer = (errors.resistance(x) / x[cold] - 1) * (constant + x[start]);
    y[0] = x[start] + warmer;
    y[1] = air ? y[0] - x[*air] : warmer;
  };
  add_estimates(result, errors.inputs(), slope_of(line), {{"T_winding"}, {"T_rise"}}, f, {}, request.propagation);
}

}  // namespace

WindingMetal copper() { return {"copper", StatedValue::unstated(0.00393, Unit::one), kRiseConstantAppliances}; }

WindingMetal aluminium() { return {"aluminium", StatedValue::unstated(0.00403, Unit::one), kRiseConstantAluminium}; }

WindingMetal metal_of(const StatedValue& coefficient) {
  return {"the stated coefficient", coefficient, 1 / coefficient.value - kReference_degc};
}

Result<Measurement> measure_resistance(const std::vector<Capture>& captures, const ResistanceRequest& request) {
  Result<ResistanceReadings> readings = readings_of(captures, request);
  if (!readings) return failure(readings);

  Measurement result;
  describe_readings(result, captures, *readings, request);
  const ResistanceLine line = fit_resistance(*readings);
  if (!note_refusals(result, *readings, line)) return result;
  add_model(result, line, request);
  if (request.traces) add_resistance_traces(result, *readings, line);

  const ReadingErrors errors(*readings, line, request);
  add_resistance(result, errors, line, request);
  if (!withhold_unresolved_resistance(result)) return result;
  if (request.cold) add_rise(result, errors, line, request);
  note_readings(result, *readings, line, request);
  return result;
}

}  // namespace coilassay

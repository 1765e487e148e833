#include "analysis/ramp.h"

#include <utility>

#include "analysis/ramp_result.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

void describe(Measurement& result, const Capture& capture, const RampRequest& request, const DrivenRecord& record) {
  result.test = "ramp";
  result.sources.push_back({capture.source, capture.samples(), capture.time.step_s});
  result.equipment = request.bench.equipment;
  result.corrections = record.corrections;
  const auto stated = [](const std::optional<StatedValue>& value) {
    return value ? std::optional<double>(value->value) : std::nullopt;
  };
  result.conditions.level_v = stated(request.bench.level);
  result.conditions.bias_a = stated(request.bench.bias);
  result.conditions.temperature_degc = stated(request.bench.temperature);
}

/// Zero lines that were subtracted, and the resistance, are corrections too.
void add_corrections(Measurement& result, const RampStory& story) {
  const RampLayout& layout = story.layout;
  if (layout.zero_known) {
    result.corrections.push_back({"zero of the voltage", layout.volt_zero, Unit::volt});
    result.corrections.push_back({"zero of the current", layout.amp_zero, Unit::ampere});
  }
  result.corrections.push_back({"winding resistance", story.resistance.error.value, Unit::ohm});
}

ModelSummary model_of(const RampStory& story) {
  const RampCurve& curve = story.shown();
  const RollOffFit& fit = curve.fit;
  ModelSummary model;
  model.name = curve.family;
  if (!curve.runner_up.empty()) model.runner_up = curve.runner_up;
  const auto u = [&](int i, double scale) { return std::sqrt(fit.fit.covariance(i, i)) * scale; };
  model.parameters["L_0"] = {fit.curve.start_slope, u(0, fit.curve.start_slope), Unit::henry};
  if (fit.curve.floor_share < 1) {
    model.parameters["saturated_share"] = {fit.curve.floor_share, u(1, 1), Unit::one};
    model.parameters["half_way_current"] = {fit.curve.knee, u(2, fit.curve.knee), Unit::ampere};
    model.parameters["exponent"] = {fit.curve.exponent, u(3, fit.curve.exponent), Unit::one};
    if (fit.curve.bend != 0) model.parameters["square_share"] = {fit.curve.bend, u(6, 1), Unit::one};
  }
  model.parameters["current_offset"] = {fit.offset, u(4, 1), Unit::ampere};
  const RampPulse& pulse = story.layout.pulses[story.first_counted()];
  model.window_s = {story.layout.start_s + static_cast<double>(pulse.start) * story.layout.step_s,
                    story.layout.start_s + static_cast<double>(pulse.peak - 1) * story.layout.step_s};
  model.residual_rms = fit.fit.residual_rms;
  model.reduced_chi_square = fit.lack_of_fit;
  model.converged = fit.fit.stop == FitStop::converged;
  return model;
}

}  // namespace

Result<Measurement> measure_ramp(const Capture& capture, const RampRequest& request) {
  const Result<DrivenRecord> raw = driven_record(capture, request.bench, request.propagation);
  if (!raw) return failure(raw);
  const DrivenRecord record = corrected_in_time(*raw);
  Measurement result;
  describe(result, capture, request, record);
  result.findings = record.findings;

  RampStory story;
  story.record = &record;
  story.request = &request;
  story.layout = find_ramps(capture, record, request.from_s, request.to_s);
  result.findings.insert(result.findings.end(), story.layout.findings.begin(), story.layout.findings.end());
  if (story.layout.refused()) {
    if (request.traces) add_ramp_traces(result, story.layout, nullptr);
    return result;
  }
  for (const RampPulse& pulse : story.layout.pulses) story.integrals.push_back(integrals_of(story.layout, pulse));
  story.resistance = resistance_of(story.layout, story.integrals, request.bench, request.propagation);
  story.inputs = ramp_inputs(record, story.layout, story.resistance);
  for (std::size_t p = 0; p < story.layout.pulses.size(); ++p) {
    Result<RampCurve> curve = curve_of(story.layout, story.layout.pulses[p], story.integrals[p], story.inputs, record);
    if (!curve) {
      result.findings.push_back({"no_ramp", Severity::refusal,
                                 "the current does not follow the flux along any curve a coil could have (" +
                                     curve.error().finding + "): check columns, --dcr and --from/--to",
                                 "", static_cast<double>(p + 1), Unit::one});
      if (request.traces) add_ramp_traces(result, story.layout, nullptr);
      return result;
    }
    story.curves.push_back(std::move(*curve));
  }
  result.conditions.peak_current_a = story.shown().high_a;
  add_corrections(result, story);
  result.model = model_of(story);
  add_ramp_estimates(result, story);
  add_loop(result, story);
  add_ramp_curve(result, story);
  add_ramp_pulses(result, story);
  add_ramp_findings(result, story);
  add_ramp_cautions(result, story);
  if (request.traces) add_ramp_traces(result, story.layout, &story);
  return result;
}

}  // namespace coilassay

#include "analysis/sweep.h"

#include <utility>

#include "analysis/sweep_result.h"

namespace coilassay {

namespace {

void describe_source(Measurement& result, const Sweep& sweep, const SweepRequest& request) {
  result.test = "sweep";
  result.sources.push_back({sweep.source, sweep.frequency_hz.size(), std::nan("")});
  result.equipment = request.bench.equipment;
  result.findings = sweep.findings;
  result.corrections = request.knowledge.corrections;
  const auto stated = [](const std::optional<StatedValue>& value) {
    return value ? std::optional<double>(value->value) : std::nullopt;
  };
  result.conditions.level_v = stated(request.bench.level);
  result.conditions.bias_a = stated(request.bench.bias);
  result.conditions.temperature_degc = stated(request.bench.temperature);
}

/// A fit that found nothing to hold on to, as a finding.
Finding no_circuit(const Error& error) {
  const std::string code = error.problem == Problem::no_signal ? "no_resonance" : "model_misfit";
  return {code, Severity::refusal, error.finding + (error.remedy.empty() ? "" : ": " + error.remedy), "L", 0, Unit::one};
}

}  // namespace

Result<Measurement> measure_sweep(const Sweep& sweep, const SweepRequest& request) {
  const Result<SweepData> data = sweep_data(sweep, request);
  if (!data) return failure(data);
  Measurement result;
  describe_source(result, sweep, request);
  if (!worth_fitting(result, *data)) return result;
  const Result<SweepModel> model = fit_sweep(*data, request);
  if (!model) {
    const Problem problem = model.error().problem;
    if (problem != Problem::no_signal && problem != Problem::not_converged) return failure(model);
    result.findings.push_back(no_circuit(model.error()));
    return result;
  }
  result.model = model_of(*model, *data);
  add_circuit(result, *model, *data, request);
  judge_sweep(result, *model, *data);
  if (result.find("L") != nullptr) {
    add_points(result, *model, *data, request);
    judge_points(result);
  }
  if (request.traces) add_sweep_traces(result, *model, *data);
  return result;
}

}  // namespace coilassay

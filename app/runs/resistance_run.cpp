#include "app/runs/resistance_run.h"

#include "analysis/resistance.h"
#include "app/runs/captures.h"

namespace coilassay {

namespace {

Result<WindingMetal> metal_of_job(const ResistanceJob& job) {
  if (job.material && job.temperature_coefficient) {
    return failure(Problem::usage, "--temperature-coefficient", "a material was given as well, which has its own",
                   "give one of them");
  }
  WindingMetal metal = job.temperature_coefficient       ? metal_of(*job.temperature_coefficient)
                       : job.material.value_or("") == "aluminium" ? aluminium()
                                                                  : copper();
  if (job.rise_constant) {
    if (!job.cold_resistance) {
      return failure(Problem::usage, "--rise-constant", "there is no temperature rise to find without a cold resistance",
                     "add --cold VALUE --cold-temperature VALUE, or leave it out");
    }
    metal.rise_constant = *job.rise_constant;
  }
  return metal;
}

Result<std::optional<ColdWinding>> cold_of_job(const ResistanceJob& job) {
  if (job.cold_resistance.has_value() != job.cold_temperature.has_value()) {
    return job.cold_resistance
               ? failure(Problem::usage, "--cold", "the temperature at which it was measured is not stated",
                         "add it, as in --cold-temperature 21.5±0.5degC")
               : failure(Problem::usage, "--cold-temperature", "there is no cold resistance it could belong to",
                         "add it, as in --cold 0.352ohm±0.2%");
  }
  if (!job.cold_resistance) return std::nullopt;
  return ColdWinding{*job.cold_resistance, *job.cold_temperature};
}

}  // namespace

Result<Measurement> run_resistance(const ResistanceJob& job, const RunContext& context) {
  ResistanceRequest request;
  const Result<WindingMetal> metal = metal_of_job(job);
  if (!metal) return failure(metal);
  request.metal = *metal;
  const Result<std::optional<ColdWinding>> cold = cold_of_job(job);
  if (!cold) return failure(cold);
  request.cold = *cold;

  if (job.bench_sheet) {
    Result<BenchSetup> sheet = read_bench_sheet(*job.bench_sheet);
    if (!sheet) return failure(sheet);
    request.bench = std::move(*sheet);
  }
  request.bench = overridden(std::move(request.bench), job.stated);
  request.propagation = job.propagation;
  request.propagation.threads = context.threads;
  request.traces = job.traces;
  Result<CapturesRead> read = read_captures(
      {.files = job.files, .segment = job.segment, .reading = request.bench.reading, .test = "resistance"}, context);
  if (!read) return failure(read);
  tell_unused_fixture(request.bench, read->notes);
  Result<Measurement> measured = measure_resistance(read->captures, request);
  if (!measured) return measured;
  measured->advice.insert(measured->advice.end(), read->notes.begin(), read->notes.end());
  return measured;
}

}  // namespace coilassay

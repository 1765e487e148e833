#include "app/runs/ring_down_run.h"

#include "analysis/ring_down.h"
#include "app/runs/captures.h"

namespace coilassay {

Result<BenchSetup> bench_of(const RingDownJob& job) {
  BenchSetup bench;
  if (job.bench_sheet) {
    Result<BenchSetup> sheet = read_bench_sheet(*job.bench_sheet);
    if (!sheet) return failure(sheet);
    bench = std::move(*sheet);
  }
  bench = overridden(std::move(bench), job.stated);

  const std::size_t factors = job.dissipation_factors.size();
  if (factors > 0 && bench.capacitors.empty()) {
    return failure(Problem::usage, "--capacitor-dissipation", "no capacitor is given that could have it",
                   "give the capacitor with --capacitor 10nF±1%");
  }
  if (factors > 1 && factors != bench.capacitors.size()) {
    return failure(Problem::usage, "--capacitor-dissipation",
                   std::to_string(factors) + " dissipation factors and " + std::to_string(bench.capacitors.size()) +
                       (bench.capacitors.size() == 1 ? " capacitor" : " capacitors"),
                   "give one for all capacitors, or one for each in the same order");
  }
  for (std::size_t i = 0; factors > 0 && i < bench.capacitors.size(); ++i) {
    bench.capacitors[i].dissipation_factor = job.dissipation_factors[factors == 1 ? 0 : i];
  }
  return bench;
}

Result<Measurement> run_ring_down(const RingDownJob& job, const RunContext& context) {
  if (job.from_s && job.to_s && *job.from_s >= *job.to_s) {
    return failure(Problem::usage, "--to", "the window ends before it begins", "give a time after that of --from");
  }
  Result<BenchSetup> bench = bench_of(job);
  if (!bench) return failure(bench);
  Result<CapturesRead> read = read_captures(
      {.files = job.files, .segment = job.segment, .reading = bench->reading, .test = "ringdown"}, context);
  if (!read) return failure(read);
  tell_unused_fixture(*bench, read->notes);

  RingDownRequest request;
  request.bench = std::move(*bench);
  request.from_s = job.from_s;
  request.to_s = job.to_s;
  request.propagation = job.propagation;
  request.propagation.threads = context.threads;
  request.traces = job.traces;
  Result<Measurement> measured = read->captures.size() == 1 ? measure_ring_down(read->captures.front(), request)
                                                            : measure_ring_down_line(read->captures, request);
  if (!measured) return measured;
  measured->advice.insert(measured->advice.end(), read->notes.begin(), read->notes.end());
  return measured;
}

}  // namespace coilassay

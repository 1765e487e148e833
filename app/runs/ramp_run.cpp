#include "app/runs/ramp_run.h"

#include "analysis/ramp.h"
#include "app/runs/captures.h"
#include "app/runs/version.h"
#include "report/ramp_netlist.h"

namespace coilassay {

Result<Measurement> run_ramp(const RampJob& job, const RunContext& context) {
  if (job.from_s && job.to_s && *job.from_s >= *job.to_s) {
    return failure(Problem::usage, "--to", "the window ends before it begins", "give a time after that of --from");
  }
  RampRequest request;
  if (job.bench_sheet) {
    Result<BenchSetup> sheet = read_bench_sheet(*job.bench_sheet);
    if (!sheet) return failure(sheet);
    request.bench = std::move(*sheet);
  }
  request.bench = overridden(std::move(request.bench), job.stated);
  Result<CapturesRead> read = read_captures(
      {.files = {job.file}, .segment = job.segment, .reading = request.bench.reading, .test = "ramp"}, context);
  if (!read) return failure(read);
  tell_unused_fixture(request.bench, read->notes);
  request.from_s = job.from_s;
  request.to_s = job.to_s;
  request.propagation = job.propagation;
  request.propagation.threads = context.threads;
  request.traces = job.traces;
  Result<Measurement> measured = measure_ramp(read->captures.front(), request);
  if (!measured) return measured;
  measured->advice.insert(measured->advice.end(), read->notes.begin(), read->notes.end());
  if (job.netlist_file) {
    if (const std::optional<std::string> netlist = ramp_netlist(*measured, program_name())) {
      if (const Result<void> written = context.write(*job.netlist_file, *netlist); !written) return failure(written);
    } else {
      measured->advice.push_back("no netlist was written: there is no curve to write");
    }
  }
  return measured;
}

}  // namespace coilassay

// coilassay ringdown
#include "app/runs/ring_down_run.h"

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"

namespace coilassay {

namespace {

Result<RingDownJob> job_of(const Arguments& arguments) {
  RingDownJob job;
  job.files = arguments.words();
  job.segment = arguments.text("--segment");
  job.bench_sheet = arguments.text("--bench");
  Result<BenchSetup> stated = stated_bench(arguments);
  if (!stated) return failure(stated);
  job.stated = std::move(*stated);
  for (const StatedValue& value : arguments.all_stated("--capacitor")) {
    job.stated.capacitors.push_back({.value = value, .dissipation_factor = std::nullopt});
  }
  job.dissipation_factors = arguments.all_stated("--capacitor-dissipation");
  job.stated.voltage.input_capacitance = arguments.stated("--probe-capacitance");
  job.stated.voltage.input_resistance = arguments.stated("--probe-resistance");
  job.stated.across_resistance = arguments.stated("--across");
  job.stated.across_capacitance = arguments.stated("--across-capacitance");
  job.from_s = arguments.plain("--from");
  job.to_s = arguments.plain("--to");
  Result<PropagationOptions> propagation = propagation_of(arguments);
  if (!propagation) return failure(propagation);
  job.propagation = *propagation;
  job.traces = arguments.has("--figure") || arguments.has("--report");
  return job;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const Result<RingDownJob> job = job_of(arguments);
  if (!job) return failure(job);
  if (const Result<void> fine = check_outputs(outputs_of(arguments)); !fine) return failure(fine);
  RunSession session(arguments, console, arguments.has("--quiet"));
  const Result<Measurement> measured = run_ring_down(*job, session.context());
  session.end_progress();
  if (!measured) return failure(measured);
  return finish_measuring(*measured, arguments, console, session.context());
}

}  // namespace

Command ring_down_command() {
  return {
      .name = "ringdown",
      .summary = "L, R and Q of a coil from its free decay across a capacitor",
      .description =
          "Connect a known capacitor across the coil, feed it a little current, let go, and capture the voltage as it "
          "rings. The release and the end of the usable decay are found from the record.\n"
          "Without a capacitor: frequency, decay and Q of the circuit. With one: also L_s, R_s and Q of the coil "
          "itself. "
          "With several files, each with its own capacitor: L and the coil's own capacitance.",
      .positional = {.name = "FILE",
                     .help = "captures as text tables; '-' is standard input",
                     .least = 1,
                     .most = 1000},
      .groups = {ring_down_options(), reading_options(), window_options(), conditions_options(), uncertainty_options(),
                 output_options(), measuring_options()},
      .examples = {{"ringdown ring.csv --capacitor 10nF±1% --probe-capacitance 13pF±2pF",
                    "L_s, R_s and Q of a coil with 10 nF across it, seen through a divider probe"},
                   {"ringdown a.csv b.csv --capacitor 1nF±1% --capacitor 22nF±1%",
                    "L and the capacitance of the winding itself"},
                   {"ringdown ring.csv --bench bench.toml --json --report ring.html",
                    "the set-up from a bench sheet, the result for a program and as a page"}},
      .run = run};
}

}  // namespace coilassay

// coilassay ramp
#include "app/runs/ramp_run.h"

#include "app/commands/command_list.h"
#include "app/commands/driven_options.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"

namespace coilassay {

namespace {

Result<RampJob> job_of(const Arguments& arguments) {
  RampJob job;
  job.file = arguments.words().front();
  job.segment = arguments.text("--segment");
  job.bench_sheet = arguments.text("--bench");
  Result<BenchSetup> stated = stated_bench(arguments);
  if (!stated) return failure(stated);
  job.stated = std::move(*stated);
  if (const auto taken = take_current(arguments, job.stated); !taken) return failure(taken);
  job.from_s = arguments.plain("--from");
  job.to_s = arguments.plain("--to");
  Result<PropagationOptions> propagation = propagation_of(arguments);
  if (!propagation) return failure(propagation);
  job.propagation = *propagation;
  job.traces = arguments.has("--figure") || arguments.has("--report");
  job.netlist_file = arguments.text("--netlist");
  return job;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const Result<RampJob> job = job_of(arguments);
  if (!job) return failure(job);
  if (const Result<void> fine = check_outputs(outputs_of(arguments)); !fine) return failure(fine);
  RunSession session(arguments, console, arguments.has("--quiet"));
  const Result<Measurement> measured = run_ramp(*job, session.context());
  session.end_progress();
  if (!measured) return failure(measured);
  return finish_measuring(*measured, arguments, console, session.context());
}

OptionGroup model_out() {
  return {.title = "Model",
          .options = {{.name = "--netlist",
                       .kind = ValueKind::file,
                       .value_name = "FILE.cir",
                       .help = "writes the coil with its L(i) as a SPICE subcircuit",
                       .example = "coil.cir"}}};
}

}  // namespace

Command ramp_command() {
  return {
      .name = "ramp",
      .summary = "saturation of a coil from a pulse that drives it up",
      .description =
          "Switch a voltage onto the coil, capture the voltage over it and the current through it until the core gives "
          "way, and let the record begin a little before. Flux is taken from the voltage, the current is fitted against it: "
          "L at zero current, the currents at which it has dropped by 10, 20 and 30 %, and the whole curve L(i).\n"
          "The winding resistance comes from --dcr, or from the record itself when the current falls back to zero in it. With "
          "several pulses the first stands apart.",
      .positional = {.name = "FILE", .help = "a capture as a text table; '-' is standard input", .least = 1, .most = 1},
      .groups = {current_options(), reading_options(), window_options(), conditions_options(), uncertainty_options(),
                 model_out(), output_options(), measuring_options()},
      .examples = {{"ramp pulse.csv --current CH2 --shunt 10mohm±1% --dcr 50mohm±5%",
                    "L_0 and the saturation currents, the second channel across a shunt"},
                   {"ramp p.csv --bench bench.toml --figure p.svg --netlist coil.cir",
                    "the set-up from a bench sheet, the curve as a figure and as a model for a circuit simulator"}},
      .run = run};
}

}  // namespace coilassay

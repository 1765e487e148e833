// coilassay sine
#include "app/runs/sine_run.h"

#include "app/commands/command_list.h"
#include "app/commands/driven_options.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"

namespace coilassay {

namespace {

Result<SineJob> job_of(const Arguments& arguments) {
  SineJob job;
  job.files = arguments.words();
  job.segment = arguments.text("--segment");
  job.bench_sheet = arguments.text("--bench");
  Result<BenchSetup> stated = stated_bench(arguments);
  if (!stated) return failure(stated);
  job.stated = std::move(*stated);
  if (auto taken = take_current(arguments, job.stated); !taken) return failure(taken);
  job.turns_ratio = arguments.stated("--turns-ratio");
  job.biases = arguments.all_stated("--bias");
  job.of_resistor = arguments.stated("--of-resistor");
  job.resistor_inductance = arguments.stated("--resistor-inductance");
  job.bench_out = arguments.text("--bench-out");
  job.from_s = arguments.plain("--from");
  job.to_s = arguments.plain("--to");
  Result<PropagationOptions> propagation = propagation_of(arguments);
  if (!propagation) return failure(propagation);
  job.propagation = *propagation;
  job.traces = arguments.has("--figure") || arguments.has("--report");
  return job;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const Result<SineJob> job = job_of(arguments);
  if (!job) return failure(job);
  if (const Result<void> fine = check_outputs(outputs_of(arguments)); !fine) return failure(fine);
  RunSession session(arguments, console, arguments.has("--quiet"));
  const Result<Measurement> measured = run_sine(*job, session.context());
  session.end_progress();
  if (!measured) return failure(measured);
  return finish_measuring(*measured, arguments, console, session.context());
}

OptionGroup bias_and_skew() {
  return {.title = "Bias, sense winding and skew",
          .options = {{.name = "--turns-ratio",
                       .kind = ValueKind::stated,
                       .value_name = "RATIO",
                       .help = "driven turns over sense turns: the voltage is that of a sense winding, P the core's loss",
                       .example = "10",
                       .unit = Unit::one,
                       .range = Range::not_zero},
                      {.name = "--bias",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "DC current through the coil; once per file, in the order of the files",
                       .example = "0.5A±2%",
                       .unit = Unit::ampere,
                       .repeatable = true},
                      {.name = "--of-resistor",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "the capture is one of this resistor in the coil's place: finds the skew",
                       .example = "50ohm±1%",
                       .unit = Unit::ohm,
                       .range = Range::positive},
                      {.name = "--resistor-inductance",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "of that resistor with its leads; up to 10 nH unless given",
                       .example = "5nH±5nH",
                       .unit = Unit::henry,
                       .range = Range::not_negative},
                      {.name = "--bench-out",
                       .kind = ValueKind::file,
                       .value_name = "FILE",
                       .help = "writes a new bench sheet with the skew that was found; a sheet is never edited",
                       .example = "bench-skew.toml"}}};
}

}  // namespace

Command sine_command() {
  return {
      .name = "sine",
      .summary = "impedance, L, R and Q of a coil from a steady sine",
      .description =
          "Drive the coil with a sine, capture the voltage over it and the current through it (a shunt or a probe), and "
          "let the source settle first. Both channels are fitted with one frequency; skew, shunt inductance and probe "
          "droop are taken out with their uncertainties.\n"
          "With several files: a table over frequency, level or bias; over bias also the small-signal saturation currents. "
          "With --of-resistor: the skew between the channels, for the bench sheet.",
      .positional = {.name = "FILE",
                     .help = "captures as text tables; '-' is standard input",
                     .least = 1,
                     .most = 1000},
      .groups = {current_options(), bias_and_skew(), reading_options(), window_options(), conditions_options(),
                 uncertainty_options(), output_options(), measuring_options()},
      .examples = {{"sine coil.csv --current CH2 --shunt 0.1ohm±1% --skew 4ns±1ns",
                    "Z, L_s, R_s and Q at the frequency of the capture, the second channel across a shunt"},
                   {"sine r.csv --shunt 0.1ohm --of-resistor 50ohm±1% --bench-out b.toml",
                    "the skew between the channels, written to a new bench sheet"},
                   {"sine a.csv b.csv c.csv --shunt 0.1ohm --bias 0A --bias 1A --bias 2A",
                    "L over bias and the currents at which it has dropped by 10, 20 and 30 %"}},
      .run = run};
}

}  // namespace coilassay

// coilassay resistance
#include "app/runs/resistance_run.h"

#include "app/commands/command_list.h"
#include "app/commands/driven_options.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

Result<ResistanceJob> job_of(const Arguments& arguments) {
  ResistanceJob job;
  job.files = arguments.words();
  job.segment = arguments.text("--segment");
  job.bench_sheet = arguments.text("--bench");
  Result<BenchSetup> stated = stated_bench(arguments);
  if (!stated) return failure(stated);
  job.stated = std::move(*stated);
  if (const Result<void> taken = take_current(arguments, job.stated); !taken) return failure(taken);
  job.material = arguments.text("--material");
  job.temperature_coefficient = arguments.stated("--temperature-coefficient");
  job.cold_resistance = arguments.stated("--cold");
  job.cold_temperature = arguments.stated("--cold-temperature");
  if (const auto constant = arguments.text("--rise-constant")) job.rise_constant = parse_plain_number(*constant);
  Result<PropagationOptions> propagation = propagation_of(arguments);
  if (!propagation) return failure(propagation);
  job.propagation = *propagation;
  job.traces = arguments.has("--figure") || arguments.has("--report");
  return job;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const Result<ResistanceJob> job = job_of(arguments);
  if (!job) return failure(job);
  if (const Result<void> fine = check_outputs(outputs_of(arguments)); !fine) return failure(fine);
  RunSession session(arguments, console, arguments.has("--quiet"));
  const Result<Measurement> measured = run_resistance(*job, session.context());
  session.end_progress();
  if (!measured) return failure(measured);
  return finish_measuring(*measured, arguments, console, session.context());
}

/// What is said of a current channel at direct current: nothing about time, and the resistance is what is asked.
OptionGroup direct_current() {
  OptionGroup group = current_options();
  std::erase_if(group.options, [](const Option& option) {
    return option.name == "--shunt-inductance" || option.name == "--skew" || option.name == "--current-probe-corner" ||
           option.name == "--dcr";
  });
  return group;
}

OptionGroup winding() {
  return {.title = "Winding and temperature",
          .options = {{.name = "--temperature",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "of the winding at rest, for R_dc_20; with --cold, of the air around the hot winding",
                       .example = "23±1degC",
                       .unit = Unit::degree_celsius,
                       .range = Range::above_absolute_zero},
                      {.name = "--material",
                       .kind = ValueKind::choice,
                       .value_name = "METAL",
                       .help = "of the wire, copper unless given",
                       .example = "aluminium",
                       .choices = {"copper", "aluminium"}},
                      {.name = "--temperature-coefficient",
                       .kind = ValueKind::stated,
                       .value_name = "NUMBER",
                       .help = "of the resistance at 20 °C in 1/K, for a wire of another metal",
                       .example = "0.0039±1%",
                       .range = Range::positive},
                      {.name = "--cold",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "resistance of the same winding cold and at rest: gives the temperature it has now",
                       .example = "0.352ohm±0.2%",
                       .unit = Unit::ohm,
                       .range = Range::positive},
                      {.name = "--cold-temperature",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "of the winding when that was measured",
                       .example = "21.5±0.5degC",
                       .unit = Unit::degree_celsius,
                       .range = Range::above_absolute_zero},
                      {.name = "--rise-constant",
                       .kind = ValueKind::choice,
                       .value_name = "K",
                       .help = "constant of the rule for the rise: 234.5 for copper in appliances and small transformers (the "
                               "default), 235 in machines and power transformers, 225 for aluminium",
                       .example = "235",
                       .choices = {"234.5", "235", "225"}}}};
}

}  // namespace

Command resistance_command() {
  return {
      .name = "resistance",
      .summary = "DC resistance of a winding, and its temperature rise",
      .description =
          "Send a direct current through the winding by two wires and read the voltage with two others. Read several times "
          "with the current one way and several times with it reversed: what does not turn round with the current, the "
          "thermal offset, is removed. A file is a table with a voltage and a current column, one row a reading; time is "
          "not needed.\n"
          "Several files are readings one after the other, such as one capture for each polarity.\n"
          "With the winding's temperature: R_dc_20. With its cold resistance: the temperature it has now.",
      .positional = {.name = "FILE",
                     .help = "readings as text tables; '-' is standard input",
                     .least = 1,
                     .most = 1000},
      .groups = {direct_current(), winding(), reading_options(),
                 {.title = "Bench", .options = {bench_file()}}, uncertainty_options(), output_options(), measuring_options()},
      .examples = {{"resistance readings.csv --temperature 23±1degC",
                    "R_dc and R_dc_20 from readings of two meters, their accuracy stated as that of a factor of one"},
                   {"resistance forward.csv reverse.csv --shunt 0.1ohm±0.5%",
                    "two captures of a scope, the current reversed between them"},
                   {"resistance hot.csv --cold 0.352ohm±0.2% --cold-temperature 21degC",
                    "temperature of the hot winding, and its rise over the air"}},
      .run = run};
}

}  // namespace coilassay

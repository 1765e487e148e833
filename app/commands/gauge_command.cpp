// coilassay gauge
#include <ostream>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/gauge_run.h"
#include "app/runs/version.h"
#include "report/gauge_json.h"
#include "report/gauge_text.h"

namespace coilassay {

namespace {

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  GaugeJob job;
  job.input = arguments.words().front();
  job.quantity = arguments.text("--quantity");
  job.part_sheet = arguments.text("--part-sheet");
  job.bench_sheet = arguments.text("--bench");
  job.tolerance = arguments.text("--tolerance");
  job.pooling = arguments.plain("--pooling");
  job.seed = arguments.count("--seed").value_or(job.seed);
  job.figure = arguments.text("--figure");
  if (const Result<void> fine = check_outputs({.figure = job.figure, .report = std::nullopt}); !fine) return failure(fine);
  RunSession session(arguments, console, arguments.has("--quiet"));
  const Result<GaugeRecord> record = run_gauge(job, session.context());
  session.end_progress();
  if (!record) return failure(record);
  TextStyle style = console.out_style();
  style.verbose = arguments.has("--verbose");
  console.out() << (arguments.has("--json") ? to_json(*record, program_name()) : to_text(*record, style));
  return ExitCode::done;
}

OptionGroup study_options() {
  return {.title = "Study",
          .options = {{.name = "--quantity",
                       .kind = ValueKind::text,
                       .value_name = "SYMBOL",
                       .help = "what is studied; else the part sheet's only limit, or what the test is made for",
                       .example = "L_s"},
                      {.name = "--part-sheet",
                       .kind = ValueKind::file,
                       .value_name = "PART.toml",
                       .help = "how the captures are measured, at which conditions, and the tolerance",
                       .example = "drum-47.toml"},
                      bench_file(),
                      {.name = "--tolerance",
                       .kind = ValueKind::text,
                       .value_name = "VALUE",
                       .help = "distance of the limits, for %GRR of the tolerance; else that of the part sheet",
                       .example = "18.8uH"},
                      {.name = "--pooling",
                       .kind = ValueKind::plain,
                       .value_name = "RATIO",
                       .help = "an interaction with a larger probability by chance is pooled with the readings within; 25 % unless given",
                       .example = "5%",
                       .range = Range::not_negative,
                       .below = 1.000001},
                      {.name = "--seed",
                       .kind = ValueKind::count,
                       .value_name = "N",
                       .help = "of the draws behind the intervals; 1 unless given",
                       .example = "7"}}};
}

}  // namespace

Command gauge_command() {
  return {
      .name = "gauge",
      .summary = "how much of the spread of readings is the gauge's",
      .description =
          "Let each operator place and read each part several times, in random order. The folder holds one capture for each "
          "reading, PART.OPERATOR.TRIAL.TEST.ENDING (07.ada.1.ringdown.csv); a table with the columns part, operator, trial and "
          "value does as well. The analysis of variance tells repeatability, reproducibility and the parts apart, with intervals.\n"
          "Its last lines go into the part sheet: the gauge's deviation then joins the uncertainty of every unit.",
      .positional = {.name = "FOLDER", .help = "captures of the study, or a table of readings", .least = 1, .most = 1},
      .groups = {study_options(),
                 {.title = "Output",
                  .options = {{.name = "--json", .help = "one JSON document on standard output instead of text"},
                              {.name = "--figure",
                               .kind = ValueKind::file,
                               .value_name = "FILE.svg",
                               .help = "draws the readings and the deviations with their intervals",
                               .example = "study.svg"}}},
                 measuring_options()},
      .examples = {{"gauge study/ --part-sheet drum-47.toml --quantity L_s", "captures measured as the part's units are"},
                   {"gauge readings.csv --quantity L_s --tolerance 18.8uH", "readings of an instrument, written down"}},
      .run = run};
}

}  // namespace coilassay

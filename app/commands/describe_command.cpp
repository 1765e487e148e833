// coilassay describe
#include <algorithm>
#include <ostream>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/describe_run.h"
#include "report/describe_json.h"
#include "report/describe_text.h"

namespace coilassay {

namespace {

/// The commands of this program, for the suggestion.
std::vector<std::string> command_names() {
  std::vector<std::string> names;
  for (const Command& command : commands()) names.emplace_back(command.name);
  return names;
}

Result<DescribeJob> job_of(const Arguments& arguments) {
  DescribeJob job;
  job.files = arguments.words();
  job.bench_sheet = arguments.text("--bench");
  job.bench_out = arguments.text("--bench-out");
  Result<ReadOptions> stated = stated_reading(arguments);
  if (!stated) return failure(stated);
  job.stated = *stated;
  job.options.tests = command_names();
  // What was needed to read the file is needed again to measure it.
  for (const char* option : {"--bench", "--delimiter", "--decimal"}) {
    if (const auto typed = arguments.text(option)) {
      job.options.arguments.insert(job.options.arguments.end(), {option, *typed});
    }
  }
  return job;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const Result<DescribeJob> job = job_of(arguments);
  if (!job) return failure(job);
  RunSession session(arguments, console, arguments.has("--quiet"));
  const Result<std::vector<DescribedFile>> described = run_describe(*job, session.context());
  session.end_progress();
  if (!described) return failure(described);

  const bool json = arguments.has("--json");
  TextStyle style = console.out_style();
  style.verbose = arguments.has("--verbose");
  if (described->size() == 1) {
    const Result<Description>& only = described->front().description;
    if (!only) return failure(only);
    console.out() << (json ? to_json(*only) : to_text(*only, style));
    return ExitCode::done;
  }
  console.out() << (json ? to_json(*described) : to_text(*described, style));
  const bool all = std::all_of(described->begin(), described->end(),
                               [](const DescribedFile& file) { return file.description.has_value(); });
  return all ? ExitCode::done : ExitCode::unusable;
}

}  // namespace

Command describe_command() {
  return {
      .name = "describe",
      .summary = "how a file was read, what it holds, and what to run next",
      .description =
          "Reads files and says how each was understood: format, signs, time, channels with their first and last "
          "samples, the range and resolution that were used, noise, clipping, missing samples, what to watch out for, "
          "and the command that measures what the file looks like.\n"
          "One file gives a page, several give a table. A file that cannot be read does not keep the others from being "
          "described; the exit code is then 2.",
      .positional = {.name = "FILE", .help = "captures and sweeps; '-' is standard input", .least = 1, .most = 100000},
      .groups = {{.title = "Reading the file", .options = {bench_file(), delimiter_sign(), decimal_sign()}},
                 {.title = "Output",
                  .options = {{.name = "--json", .help = "one JSON document on standard output instead of text"},
                              {.name = "--bench-out",
                               .kind = ValueKind::file,
                               .value_name = "FILE.toml",
                               .help =
                                   "keeps how the file was read in a new bench sheet; an existing file is not touched",
                               .example = "scope.toml"}}},
                 measuring_options()},
      .examples = {{"describe ring.csv", "what is in the file, and what to run next"},
                   {"describe captures/*.csv", "many files, one line each"},
                   {"describe ring.csv --bench-out scope.toml",
                    "keeps the way the file was read for the next thousand of its kind"}},
      .run = run};
}

}  // namespace coilassay

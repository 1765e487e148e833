// coilassay acquire
#include <ostream>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/commands/stop_signal.h"
#include "app/runs/acquire_run.h"
#include "base/outside_text.h"
#include "report/text_layout.h"

namespace coilassay {

namespace {

void show(const TryReport& report, Console& console) {
  const TextStyle style = console.out_style();
  std::ostream& out = console.out();
  const auto line = [&](const std::string& text) { out << in_script(text, style.script) << '\n'; };
  std::size_t number = 0;
  for (const TryStep& step : report.steps) {
    line(std::to_string(++number) + ". " + step.title);
    for (const auto& [sent, bytes] : step.bytes) line((sent ? "     sent  " : "     came  ") + bytes);
    for (const std::string& words : step.read_as) line("     " + words);
    if (step.trouble) {
      line("     here it goes wrong: " + shown(step.trouble->finding, 400));
      if (!step.trouble->remedy.empty()) line("     try: " + shown(step.trouble->remedy, 400));
    }
  }
  if (report.works()) line("The profile works.");
}

Result<ExitCode> try_profile(const Arguments& arguments, Console& console, const RunContext& context) {
  for (const char* option : {"-o", "--count", "--every"}) {
    if (arguments.has(option)) {
      return failure(Problem::usage, option, "--try writes no capture", "leave it out, or leave --try out");
    }
  }
  const StopSignal signal;
  const auto report = run_try_profile(arguments.words().front(), arguments.text("--trace"), StopSignal::came, context);
  if (!report) return failure(report);
  if (arguments.has("--json")) console.out() << to_json(*report);
  else show(*report, console);
  return report->works() ? ExitCode::done : ExitCode::broken;
}

/// A file without one value is no success: broken when no reply could be read, undecided when the replies said there is none.
ExitCode ending(const AcquireSummary& summary, Console& console) {
  if (summary.rows == 0 || summary.useless < summary.rows) return ExitCode::done;
  const std::string all = summary.rows == 1 ? "the one reading" : "all " + std::to_string(summary.rows) + " readings";
  if (summary.unreadable == summary.rows) {
    console.say("no value was measured: " + all + " failed, the last because " + shown(summary.last_trouble, 300) + "; coilassay acquire PROFILE --try shows every byte");
    return ExitCode::broken;
  }
  console.say("no value was measured: " + all + " came without one, over range or with a status that says not to use them; look at the part, its contacts and the range");
  return ExitCode::undecided;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const bool quiet = arguments.has("--quiet");
  RunSession session(arguments, console, true);
  if (arguments.has("--try")) return try_profile(arguments, console, session.context());
  AcquireJob job;
  job.profile = arguments.words().front();
  const auto file = arguments.text("-o");
  if (!file) return failure(Problem::usage, "-o", "it is not said where the capture goes", "write it like -o run.csv; '-' is standard output");
  job.file = *file;
  job.count = arguments.count("--count");
  job.every_s = arguments.plain("--every");
  job.trace = arguments.text("--trace");
  const bool json = arguments.has("--json");
  if (json && job.file == "-") return failure(Problem::usage, "--json", "standard output cannot be both capture and document", "give -o a file");
  const StopSignal signal;
  job.stopped = StopSignal::came;
  if (!quiet) job.remark = [&](const std::string& words) { console.say(words); };
  if (arguments.has("--verbose")) job.row_written = [&](const std::string& words) { console.say(words); };
  const auto summary = run_acquire(job, session.context());
  if (!summary) return failure(summary);
  if (json) {
    console.out() << to_json(*summary);
  } else if (!quiet) {
    std::string words = "wrote " + shown(summary->file, 100) + ": " + std::to_string(summary->rows) + " " + (summary->rows == 1 ? summary->what.substr(0, summary->what.size() - 1) : summary->what);
    if (summary->without_value > 0) words += ", " + std::to_string(summary->without_value) + " of them without a value";
    if (!summary->instrument.empty()) words += ", from " + shown(summary->instrument, 80);
    console.say(words);
  }
  return ending(*summary, console);
}

}  // namespace

Command acquire_command() {
  return {.name = "acquire",
          .summary = "readings or waveforms from an instrument, into a file",
          .description =
              "Talks to an instrument as its profile says and writes what comes into a new capture file, row by row, so that a "
              "power cut keeps what came. The file's head tells the identity and the settings; describe and the measuring commands read it.\n"
              "With [record] in the profile one waveform is taken, else readings: --count of them, every --every, or until Ctrl-C.\n"
              "With --try nothing is written: the profile is gone through step by step, showing what was sent, what came, how it was read, "
              "and where it went wrong.\n"
              "Exit code: 3 when every reading came without a value, 4 when no reply could be read.",
          .positional = {.name = "PROFILE.toml", .help = "how to talk to the instrument", .least = 1, .most = 1},
          .groups = {{"What is taken",
                      {{.name = "-o", .kind = ValueKind::file, .value_name = "FILE", .help = "the new capture, as CSV; '-' is standard output", .example = "run.csv"},
                       {.name = "--count", .kind = ValueKind::count, .value_name = "N", .help = "so many readings, or records; readings go on until stopped unless given", .example = "100", .least = 1},
                       {.name = "--every", .kind = ValueKind::plain, .value_name = "TIME", .help = "pace of the readings; as fast as they come unless given", .example = "1s", .unit = Unit::second, .range = Range::positive},
                       {.name = "--try", .help = "goes through the profile step by step and writes no capture"}}},
                     {"Output",
                      {{.name = "--json", .help = "one JSON document on standard output instead of text"},
                       {.name = "--trace", .kind = ValueKind::file, .value_name = "FILE", .help = "a log of every byte both ways, which a profile can play again", .example = "talk.trace"},
                       {.name = "--verbose", .help = "tells each row as it is written"}}},
                     everywhere_options()},
          .examples = {{"acquire meter.toml --try", "does the profile fit the instrument?"},
                       {"acquire meter.toml -o run.csv --count 60 --every 1s", "a reading a second for a minute"},
                       {"acquire digitiser.toml -o sine.csv", "one waveform, to be measured with sine"}},
          .run = run};
}

}  // namespace coilassay

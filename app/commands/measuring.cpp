#include "app/commands/measuring.h"

#include <chrono>
#include <ostream>

#include "app/commands/terminal_progress.h"
#include "app/runs/version.h"
#include "report/result_json.h"

namespace coilassay {

namespace {

double steady_seconds() {
  return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count();
}

struct Sign {
  std::string_view typed;
  char sign;
};

Result<std::optional<char>> sign_of(const Arguments& arguments, std::string_view option,
                                    std::initializer_list<Sign> signs, const std::string& remedy) {
  const std::optional<std::string> typed = arguments.text(option);
  if (!typed) return std::nullopt;
  for (const Sign& each : signs) {
    if (each.typed == *typed) return each.sign;
  }
  return failure(Problem::usage, std::string(option), in_quotes(*typed) + " cannot be that sign", remedy);
}

}  // namespace

Result<ReadOptions> stated_reading(const Arguments& arguments) {
  const auto delimiter = sign_of(arguments, "--delimiter",
                                 {{",", ','}, {";", ';'}, {"\t", '\t'}, {"tab", '\t'}, {" ", ' '}, {"space", ' '}},
                                 "give ',' or ';' in quotes, tab or space");
  if (!delimiter) return failure(delimiter);
  const auto decimal = sign_of(arguments, "--decimal", {{".", '.'}, {",", ','}}, "give '.' or ','");
  if (!decimal) return failure(decimal);
  if (*delimiter && *delimiter == *decimal) {
    return failure(Problem::usage, "--decimal", "the decimal sign and the delimiter are the same",
                   "files with a decimal comma have a semicolon or a tab between their columns");
  }
  ReadOptions reading;
  reading.delimiter = *delimiter;
  reading.decimal = *decimal;
  return reading;
}

Result<BenchSetup> stated_bench(const Arguments& arguments) {
  const Result<ReadOptions> reading = stated_reading(arguments);
  if (!reading) return failure(reading);
  BenchSetup bench;
  bench.reading = *reading;
  bench.voltage.column = arguments.text("--voltage");
  bench.voltage.low_column = arguments.text("--voltage-low");
  bench.voltage.gain = arguments.stated("--voltage-gain");
  bench.temperature = arguments.stated("--temperature");
  // Readings of direct voltage and current have neither a sample clock nor a stimulus.
  const Command& command = arguments.command();
  if (command.find("--timebase") != nullptr) {
    if (const auto ratio = arguments.plain("--timebase")) bench.timebase = StatedValue::unstated(*ratio, Unit::one);
  }
  if (command.find("--level") != nullptr) bench.level = arguments.stated("--level");
  return bench;
}

Result<PropagationOptions> propagation_of(const Arguments& arguments) {
  PropagationOptions options;
  options.by_trials = arguments.text("--propagate") == "trials";
  options.exact_bench = arguments.has("--exact-bench");
  const auto trials = arguments.count("--trials");
  const auto seed = arguments.count("--seed");
  for (const auto& [name, given] : {std::pair{"--trials", trials}, std::pair{"--seed", seed}}) {
    if (given && !options.by_trials) {
      return failure(Problem::usage, name, "there are no trials it could apply to",
                     "add --propagate trials, or leave it out");
    }
  }
  options.trials = trials.value_or(options.trials);
  options.seed = seed.value_or(options.seed);
  return options;
}

OutputRequest outputs_of(const Arguments& arguments) {
  return {.figure = arguments.text("--figure"), .report = arguments.text("--report")};
}

RunSession::RunSession(const Arguments& arguments, Console& console, bool quiet) {
  const Surroundings& around = console.surroundings();
  if (around.error_is_terminal && !quiet) {
    progress_ = std::make_unique<TerminalProgress>(console.error(), around.script, around.width, steady_seconds);
  }
  context_.progress = progress_.get();
  if (arguments.command().find("--threads") != nullptr) {
    context_.threads = static_cast<unsigned>(arguments.count("--threads").value_or(context_.threads));
  }
  context_.now = console.now();
  context_.write = [&console](const std::string& path, const std::string& contents) {
    return console.write(path, contents);
  };
}

Result<ExitCode> finish_measuring(const Measurement& measurement, const Arguments& arguments, Console& console,
                                  const RunContext& context) {
  const Result<bool> written = write_outputs(measurement, outputs_of(arguments), context);
  const bool json = arguments.has("--json");
  const bool verbose = arguments.has("--verbose");
  if (json && written) {
    console.out() << to_json(measurement, program_name());
  } else {
    // With --json and a failure, standard output belongs to the error document; the numbers are not lost.
    TextStyle style = json ? console.error_style() : console.out_style();
    style.verbose = verbose;
    (json ? console.error() : console.out()) << to_text(measurement, style);
  }
  if (!written) return failure(written);
  if (!*written && !arguments.has("--quiet")) console.say("no figure was written: there is nothing to draw");
  const bool measured = measurement.find(leading_symbol(measurement.test)) != nullptr;
  return measured ? ExitCode::done : ExitCode::undecided;
}

}  // namespace coilassay

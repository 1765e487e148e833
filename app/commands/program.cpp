#include "app/commands/program.h"

#include <algorithm>
#include <cerrno>
#include <new>
#include <ostream>
#include <system_error>

#include "app/commands/arguments.h"
#include "app/commands/command_list.h"
#include "app/commands/console.h"
#include "app/commands/help_text.h"
#include "app/runs/version.h"
#include "base/outside_text.h"
#include "report/result_json.h"

namespace coilassay {

namespace {

constexpr std::string_view kOverviewHint = "coilassay help shows all commands";

bool asks_for_help(const std::string& word) {
  return word == "--help" || word == "-h";
}

/// "-h" for "--help" everywhere, before "--".
std::vector<std::string> with_long_help(std::vector<std::string> words) {
  const auto end = std::find(words.begin(), words.end(), "--");
  std::replace(words.begin(), end, std::string("-h"), std::string("--help"));
  return words;
}

Result<ExitCode> start(const Command& command, const std::vector<std::string>& words, Console& console) {
  Result<Arguments> arguments = read_arguments(command, with_long_help(words));
  if (!arguments) return failure(arguments);
  if (arguments->text("--color") == "never") console.forbid_color();
  if (arguments->has("--help")) {
    console.out() << help_page(command, console.out_style());
    return ExitCode::done;
  }
  Arguments::Files files = arguments->files();
  if (command.find("--bench") != nullptr) {
    if (const auto bench = arguments->text("--bench"); bench && !files.written.empty()) add_bench_files(files.read, *bench);
  }
  if (const Result<void> spared = spare_files(files.written, files.read); !spared) return failure(spared);
  return command.run(*arguments, console);
}

Result<ExitCode> dispatch(const std::vector<std::string>& words, Console& console) {
  if (words.empty()) {
    console.error() << overview(commands(), console.error_style());
    return ExitCode::unusable;
  }
  const std::string& first = words.front();
  if (asks_for_help(first)) {
    console.out() << overview(commands(), console.out_style());
    return ExitCode::done;
  }
  if (first == "--version") {
    console.out() << program_name() << '\n';
    return ExitCode::done;
  }
  if (first.starts_with('-')) {
    return failure(Problem::usage, shown(first, 60), "the command comes first, its options after it",
                   std::string(kOverviewHint));
  }
  if (words.size() > 1) {
    if (const Command* command = find_command(first + " " + words[1])) {
      return start(*command, {words.begin() + 2, words.end()}, console);
    }
  }
  if (const Command* command = find_command(first)) return start(*command, {words.begin() + 1, words.end()}, console);

  const std::vector<const Command*> family = commands_named(first);
  if (family.empty()) return no_such_command(first);
  if (words.size() > 1 && asks_for_help(words[1])) return start(*find_command("help"), {first}, console);
  if (words.size() > 1 && !words[1].starts_with('-')) return no_such_command(first + " " + words[1]);
  std::string kinds;
  for (const Command* command : family)
    kinds += (kinds.empty() ? "coilassay " : ", coilassay ") + std::string(command->name);
  return failure(Problem::usage, "coilassay " + first, "it does not say what to " + first, kinds);
}

Result<ExitCode> within_memory(const std::vector<std::string>& words, Console& console) {
  try {
    return dispatch(words, console);
  } catch (const std::bad_alloc&) {
    return failure(Problem::unreadable, "coilassay", "there is not enough memory for this",
                   "a shorter record, or a machine with more memory");
  }
}

/// Whether programs are to read what comes out, also when the command line itself is wrong.
bool wants_json(const std::vector<std::string>& words) {
  const auto end = std::find(words.begin(), words.end(), "--");
  return std::find(words.begin(), end, "--json") != end;
}

/// Whether standard output took everything. A reader that went away has what it wanted.
Result<void> flushed(Console& console) {
  const bool fine = static_cast<bool>(console.out());
  errno = 0;
  const bool stored = console.out().rdbuf()->pubsync() == 0;
  if ((fine && stored) || errno == EPIPE) return {};
  const std::string why = errno == 0 ? "the stream failed" : std::generic_category().message(errno);
  return failure(Problem::cannot_write, "standard output", "not all of the result could be written: " + why,
                 "give it a place with room, or a file");
}

}  // namespace

std::vector<const Command*> commands_named(const std::string& name) {
  std::vector<const Command*> found;
  for (const Command& command : commands()) {
    if (command.name == name || command.name.starts_with(name + " ")) found.push_back(&command);
  }
  return found;
}

tl::unexpected<Error> no_such_command(const std::string& typed) {
  std::vector<std::string_view> names;
  for (const Command& command : commands()) {
    names.push_back(command.name);
    if (const std::size_t blank = command.name.find(' '); blank != std::string_view::npos) {
      names.push_back(command.name.substr(0, blank));
    }
  }
  const std::string_view hint = nearest(typed, names);
  return failure(Problem::usage, shown(typed, 60), "there is no such command",
                 hint.empty() ? std::string(kOverviewHint)
                              : "did you mean coilassay " + std::string(hint) + "? " + std::string(kOverviewHint));
}

ExitCode exit_code_of(Problem problem) {
  return problem == Problem::instrument || problem == Problem::ledger ? ExitCode::broken : ExitCode::unusable;
}

int run_program(const std::vector<std::string>& words, Console& console) {
  const Result<ExitCode> ended = within_memory(words, console);
  ExitCode code = ended ? *ended : exit_code_of(ended.error().problem);
  if (!ended) {
    if (wants_json(words)) {
      console.out() << to_json(ended.error());
    } else {
      console.out().flush();  // a result that was already shown stands before the error
      console.show(ended.error());
    }
  }
  if (const Result<void> all = flushed(console); !all) {
    console.show(all.error());
    code = ExitCode::unusable;
  }
  console.error().flush();
  return static_cast<int>(code);
}

}  // namespace coilassay

// help, man and completion: the command table itself, for people and shells.
#include <algorithm>
#include <ostream>

#include "app/commands/arguments.h"
#include "app/commands/command_list.h"
#include "app/commands/console.h"
#include "app/commands/help_text.h"
#include "app/commands/program.h"
#include "app/commands/reference.h"
#include "app/commands/shared_options.h"
#include "app/runs/version.h"

namespace coilassay {

namespace {

Result<ExitCode> run_help(const Arguments& arguments, Console& console) {
  if (arguments.has("--markdown")) {
    console.out() << markdown_reference(commands());
    return ExitCode::done;
  }
  std::string name;
  for (const std::string& word : arguments.words()) name += (name.empty() ? "" : " ") + word;
  if (name.empty()) {
    console.out() << overview(commands(), console.out_style());
    return ExitCode::done;
  }
  const std::vector<const Command*> named = commands_named(name);
  if (named.empty()) return no_such_command(name);
  if (named.size() == 1) {
    console.out() << help_page(*named.front(), console.out_style());
    return ExitCode::done;
  }
  for (const Command* command : named) {
    console.out() << usage_of(*command) << "\n    " << command->summary << '\n';
  }
  return ExitCode::done;
}

Result<ExitCode> run_man(const Arguments&, Console& console) {
  console.out() << man_page(commands(), version());
  return ExitCode::done;
}

Result<ExitCode> run_completion(const Arguments& arguments, Console& console) {
  if (arguments.words().front() != "bash") {
    return failure(Problem::usage, "coilassay completion", "completion is made for bash only",
                   "coilassay completion bash");
  }
  console.out() << bash_completion(commands());
  return ExitCode::done;
}

}  // namespace

Command help_command() {
  return {.name = "help",
          .summary = "options and examples of a command",
          .positional = {.name = "COMMAND",
                         .help = "the command; without one, all of them in short",
                         .most = 2,
                         .files = false},
          .groups = {{.title = "Form",
                      .options = {{.name = "--markdown", .help = "the reference of all commands as Markdown"}}},
                     everywhere_options()},
          .examples = {{"help ringdown", "everything about measuring a free decay"}},
          .run = run_help};
}

Command man_command() {
  return {.name = "man",
          .summary = "the manual as a man page on standard output",
          .groups = {everywhere_options()},
          .examples = {{"man | man -l -", "shows it"}},
          .run = run_man};
}

Command completion_command() {
  return {.name = "completion",
          .summary = "completion of commands, options and files for bash",
          .positional = {.name = "bash", .help = "the shell", .least = 1, .most = 1, .files = false},
          .groups = {everywhere_options()},
          .examples = {{"completion bash", "a line source <(coilassay completion bash) in ~/.bashrc switches it on"}},
          .run = run_completion};
}

}  // namespace coilassay

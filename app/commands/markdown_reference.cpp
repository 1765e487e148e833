#include <string>

#include "app/commands/reference.h"

namespace coilassay {

namespace {

std::string anchor(std::string_view name) {
  std::string out(name);
  for (char& c : out) c = c == ' ' ? '-' : c;
  return out;
}

/// A cell of a table: a bar would end it.
std::string cell(std::string_view text) {
  std::string out;
  for (const char c : text) {
    if (c == '|') out += '\\';
    out += c;
  }
  return out;
}

std::string code(std::string_view text) {
  return "`" + cell(text) + "`";
}

}  // namespace

std::string markdown_reference(std::span<const Command> commands) {
  std::string page = "# Commands\n\nWritten by `coilassay help --markdown`; a test keeps it current.\n\n";
  page += "| command | what it does |\n|---|---|\n";
  for (const Command& command : commands) {
    page +=
        "| [`" + std::string(command.name) + "`](#" + anchor(command.name) + ") | " + cell(command.summary) + " |\n";
  }
  page +=
      "\nExit codes: 0 measured or passed, 1 failed, 2 the command line or an input cannot be used (or an output "
      "cannot be "
      "written), 3 undecided, not comparable or refused, 4 instrument or ledger.\n";
  for (const Command& command : commands) {
    page += "\n## " + std::string(command.name) + "\n\n    " + usage_of(command) + "\n";
    std::string_view rest = command.description;
    while (!rest.empty()) {
      const std::string_view paragraph = rest.substr(0, rest.find('\n'));
      rest.remove_prefix(std::min(rest.size(), paragraph.size() + 1));
      page += "\n" + std::string(paragraph) + "\n";
    }
    if (!command.positional.help.empty()) {
      page += "\n" + code(command.positional.name) + ": " + std::string(command.positional.help) + ".\n";
    }
    for (const OptionGroup& group : command.groups) {
      page += "\n**" + std::string(group.title) + "**\n\n| option | meaning | example |\n|---|---|---|\n";
      for (const Option& option : group.options) {
        page += "| " + code(usage_of(option)) + " | " + cell(option.help) + " | " +
                (option.example.empty() ? "" : code(option.example)) + " |\n";
      }
    }
    if (!command.examples.empty()) page += "\n**Examples**\n";
    for (const Example& example : command.examples) {
      page += "\n    coilassay " + std::string(example.line) + "\n\n" + std::string(example.does) + ".\n";
    }
  }
  return page;
}

}  // namespace coilassay

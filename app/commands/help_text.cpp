#include "app/commands/help_text.h"

#include <algorithm>

#include "report/text_layout.h"

namespace coilassay {

namespace {

constexpr std::size_t kWidestLeft = 30;  // a longer left side gets a line of its own

std::string painted(std::string_view text, const TextStyle& style) {
  return style.color ? "\x1b[1m" + std::string(text) + "\x1b[0m" : std::string(text);
}

std::string heading(std::string_view text, const TextStyle& style) {
  return '\n' + painted(text, style) + '\n';
}

/// "  left    right", the right side wrapped in its own column.
std::string entry(std::string_view left, const std::string& right, std::size_t left_width, const TextStyle& style) {
  const std::string begin = "  " + std::string(left);
  const std::size_t column = left_width + 4;
  if (display_width(begin) + 2 <= column) return wrapped(right, padded(begin, column), style.width);
  return begin + '\n' + wrapped(right, std::string(column, ' '), style.width);
}

std::string in_words(std::string_view text, const TextStyle& style) {
  return in_script(text, style.script);
}

std::string help_of(const Option& option) {
  std::string help(option.help);
  const bool shows_more = option.kind == ValueKind::stated || option.kind == ValueKind::plain;
  if (shows_more && !option.example.empty()) help += " (" + std::string(option.example) + ")";
  return help;
}

}  // namespace

std::string overview(std::span<const Command> commands, const TextStyle& style) {
  std::string page =
      painted("coilassay", style) + in_words(" measures inductors and judges them.", style) + '\n';
  page += heading("Commands", style);
  std::size_t widest = 0;
  for (const Command& command : commands) widest = std::max(widest, command.name.size());
  for (const Command& command : commands) {
    page += entry(command.name, in_words(command.summary, style), widest, style);
  }
  page += heading("To begin", style);
  page += entry("coilassay help COMMAND", in_words("options and examples of a command", style), 24, style);
  page += entry("coilassay --version", in_words("which program this is", style), 24, style);
  page += heading("How it ends", style);
  page +=
      wrapped(in_words("0 measured or passed, 1 failed, 2 the command line or an input cannot be used, 3 undecided or "
                       "refused, 4 instrument or ledger",
                       style),
              "  exit code ", style.width);
  return page;
}

std::string help_page(const Command& command, const TextStyle& style) {
  std::string page = painted("coilassay " + std::string(command.name), style) + '\n';
  page += wrapped(in_words(command.summary, style), "  ", style.width);
  page += '\n' + in_words("  " + usage_of(command), style) + '\n';
  std::string_view rest = command.description;
  while (!rest.empty()) {
    const std::string_view paragraph = rest.substr(0, rest.find('\n'));
    rest.remove_prefix(std::min(rest.size(), paragraph.size() + 1));
    page += '\n' + wrapped(in_words(paragraph, style), "", style.width);
  }
  std::size_t widest = 0;
  for (const OptionGroup& group : command.groups) {
    for (const Option& option : group.options) widest = std::max(widest, usage_of(option).size());
  }
  widest = std::min(widest, kWidestLeft);
  if (!command.positional.help.empty()) {
    page += '\n' + entry(command.positional.name, in_words(command.positional.help, style), widest, style);
  }
  for (const OptionGroup& group : command.groups) {
    page += heading(in_words(group.title, style), style);
    for (const Option& option : group.options) {
      page += entry(usage_of(option), in_words(help_of(option), style), widest, style);
    }
  }
  if (!command.examples.empty()) page += heading(command.examples.size() == 1 ? "Example" : "Examples", style);
  for (const Example& example : command.examples) {
    page += "  coilassay " + in_words(example.line, style) + '\n';
    page += wrapped(in_words(example.does, style), "      ", style.width);
  }
  return page;
}

}  // namespace coilassay

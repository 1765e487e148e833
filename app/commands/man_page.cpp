#include <string>

#include "app/commands/reference.h"
#include "report/text_layout.h"

namespace coilassay {

namespace {

/// Text as roff takes it: plain ASCII, no escape or request of its own by accident.
std::string roff(std::string_view text) {
  std::string out;
  for (const char c : in_script(text, Script::ascii)) {
    if (c == '\\') {
      out += "\\e";
    } else if (c == '-') {
      out += "\\-";
    } else if (c == '\n') {
      out += "\n.PP\n";
    } else {
      if ((c == '.' || c == '\'') && (out.empty() || out.back() == '\n')) out += "\\&";
      out += c;
    }
  }
  return out;
}

std::string entry(std::string_view bold, std::string_view rest, std::string_view help) {
  std::string out = ".TP\n\\fB" + roff(bold) + "\\fR";
  if (!rest.empty()) out += " \\fI" + roff(rest) + "\\fR";
  return out + '\n' + roff(help) + '\n';
}

std::string upper(std::string_view text) {
  std::string out(text);
  for (char& c : out) c = c >= 'a' && c <= 'z' ? static_cast<char>(c - 'a' + 'A') : c;
  return out;
}

}  // namespace

std::string man_page(std::span<const Command> commands, std::string_view version) {
  std::string page = ".TH COILASSAY 1 \"\" \"coilassay " + std::string(version) + "\" \"coilassay\"\n";
  page += ".SH NAME\ncoilassay \\- measures inductors and judges them\n.SH SYNOPSIS\n";
  for (const Command& command : commands) page += ".br\n" + roff(usage_of(command)) + '\n';
  for (const Command& command : commands) {
    page += ".SH " + roff(upper(command.name)) + "\n" + roff(command.summary) + ".\n.PP\n";
    if (!command.description.empty()) page += roff(command.description) + '\n';
    if (!command.positional.help.empty()) page += entry(command.positional.name, "", command.positional.help);
    for (const OptionGroup& group : command.groups) {
      page += ".SS " + roff(group.title) + '\n';
      for (const Option& option : group.options) {
        std::string help(option.help);
        if (!option.example.empty())
          help += ". Example: " + std::string(option.name) + " " + std::string(option.example);
        const std::string usage = usage_of(option);
        const std::size_t end = option.name.size();
        page += entry(option.name, usage.size() > end ? usage.substr(end + 1) : "", help + ".");
      }
    }
    if (!command.examples.empty()) page += ".SS Examples\n";
    for (const Example& example : command.examples) {
      page += ".TP\n" + roff("coilassay " + std::string(example.line)) + '\n' + roff(example.does) + ".\n";
    }
  }
  page += ".SH EXIT STATUS\n";
  page += entry("0", "", "measured, or passed.");
  page += entry("1", "", "failed.");
  page += entry("2", "", "the command line or an input cannot be used, or an output cannot be written.");
  page += entry("3", "", "undecided, not comparable, or the measurement was refused.");
  page += entry("4", "", "instrument or ledger.");
  page += ".SH ENVIRONMENT\n";
  page += entry("NO_COLOR", "", "when set, text is never coloured.");
  page += entry("LC_ALL, LC_CTYPE, LANG", "", "the first that is set decides whether text is UTF-8 or plain ASCII.");
  return page;
}

}  // namespace coilassay

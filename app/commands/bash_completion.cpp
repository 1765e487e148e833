#include <set>
#include <string>

#include "app/commands/reference.h"

namespace coilassay {

namespace {

std::string first_word(std::string_view name) {
  return std::string(name.substr(0, name.find(' ')));
}

std::string second_word(std::string_view name) {
  const std::size_t blank = name.find(' ');
  return blank == std::string_view::npos ? "" : std::string(name.substr(blank + 1));
}

std::string joined(const std::set<std::string>& words) {
  std::string out;
  for (const std::string& word : words) out += (out.empty() ? "" : " ") + word;
  return out;
}

/// Lines of a case statement: what may follow an option of this command, then its options.
std::string cases_of(const Command& command) {
  std::string values, files, others, options;
  for (const OptionGroup& group : command.groups) {
    for (const Option& option : group.options) {
      const std::string name(option.name);
      options += (options.empty() ? "" : " ") + name;
      if (option.kind == ValueKind::choice) {
        std::string choices;
        for (const std::string_view choice : option.choices)
          choices += (choices.empty() ? "" : " ") + std::string(choice);
        values += "        " + name + ") words='" + choices + "' ;;\n";
      } else if (option.kind == ValueKind::file) {
        files += (files.empty() ? "" : "|") + name;
      } else if (option.kind != ValueKind::flag) {
        others += (others.empty() ? "" : "|") + name;
      }
    }
  }
  std::string out = "    '" + std::string(command.name) + "')\n      case $before in\n" + values;
  if (!files.empty()) out += "        " + files + ") files=yes ;;\n";
  if (!others.empty()) out += "        " + others + ") ;;\n";
  out += "        *) words='" + options + "'";
  if (command.positional.files && command.positional.most > 0) out += "; files=yes";
  return out + " ;;\n      esac ;;\n";
}

}  // namespace

std::string bash_completion(std::span<const Command> commands) {
  std::set<std::string> firsts, families;
  for (const Command& command : commands) {
    firsts.insert(first_word(command.name));
    if (!second_word(command.name).empty()) families.insert(first_word(command.name));
  }
  std::string out =
      "# bash completion for coilassay: source <(coilassay completion bash)\n_coilassay() {\n"
      "  local word=${COMP_WORDS[COMP_CWORD]} before='' command=${COMP_WORDS[1]} words='' files=''\n"
      "  COMPREPLY=()\n  if ((COMP_CWORD == 1)); then\n    COMPREPLY=($(compgen -W '" +
      joined(firsts) + " --help --version' -- \"$word\"))\n    return\n  fi\n  before=${COMP_WORDS[COMP_CWORD-1]}\n";
  for (const std::string& family : families) {
    std::set<std::string> kinds;
    for (const Command& command : commands) {
      if (first_word(command.name) == family) kinds.insert(second_word(command.name));
    }
    out += "  if [[ $command == " + family +
           " ]]; then\n    if ((COMP_CWORD == 2)); then\n      COMPREPLY=($(compgen -W '" + joined(kinds) +
           "' -- \"$word\"))\n      return\n    fi\n    command=\"$command ${COMP_WORDS[2]}\"\n  fi\n";
  }
  out += "  case $command in\n";
  for (const Command& command : commands) out += cases_of(command);
  out +=
      "  esac\n"
      "  if [[ -z $files || $word == -* ]]; then COMPREPLY=($(compgen -W \"$words\" -- \"$word\")); fi\n"
      "  if [[ -n $files && $word != -* ]]; then\n    compopt -o filenames 2>/dev/null\n"
      "    mapfile -t COMPREPLY < <(compgen -f -- \"$word\")\n  fi\n}\ncomplete -F _coilassay coilassay\n";
  return out;
}

}  // namespace coilassay

#include "app/commands/option_table.h"

#include "base/outside_text.h"

namespace coilassay {

const Option* Command::find(std::string_view option) const {
  for (const OptionGroup& group : groups) {
    for (const Option& each : group.options) {
      if (each.name == option) return &each;
    }
  }
  return nullptr;
}

std::string usage_of(const Option& option) {
  std::string usage(option.name);
  if (option.kind == ValueKind::choice) {
    for (std::size_t i = 0; i < option.choices.size(); ++i) {
      usage += (i == 0 ? " " : "|");
      usage += option.choices[i];
    }
  } else if (option.kind != ValueKind::flag) {
    usage += ' ';
    usage += option.value_name;
  }
  return usage;
}

std::string usage_of(const Command& command) {
  std::string usage = "coilassay ";
  usage += command.name;
  const Positional& words = command.positional;
  if (!words.name.empty()) {
    std::string word(words.name);
    const bool one_each = word.find(' ') != std::string::npos;  // "FILE ID"
    if (words.most > 1 && !one_each) word += "...";
    usage += words.least == 0 ? " [" + word + "]" : " " + word;
  }
  return usage + " [options]";
}

std::string in_quotes(std::string_view outside) {
  return "'" + shown(outside, 60) + "'";
}

std::string how_to_write(const Option& option) {
  if (option.example.empty()) return "write it like " + usage_of(option);
  return "write it like " + std::string(option.name) + " " + std::string(option.example);
}

}  // namespace coilassay

// Splits the words of a command line into options with their texts and the rest.
#pragma once

#include <string>
#include <utility>
#include <vector>

#include "app/commands/option_table.h"

namespace coilassay {

struct SplitLine {
  std::vector<std::pair<const Option*, std::string>> options;  // in the order of the table, then as typed
  std::vector<std::string> words;
};

/// "--name value", "--name=value", "-o value" and "-ovalue"; a value may begin with '-'; after "--" nothing is an
/// option. usage: an option the command does not have (with the nearest one it has), an option without its value, a
/// flag with one.
Result<SplitLine> split_command_line(const Command& command, const std::vector<std::string>& words);

}  // namespace coilassay

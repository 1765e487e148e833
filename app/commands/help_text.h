// Help on the terminal.
#pragma once

#include <span>
#include <string>

#include "app/commands/option_table.h"
#include "report/result_text.h"

namespace coilassay {

/// What the program is for and its commands, one line each.
std::string overview(std::span<const Command> commands, const TextStyle& style);

/// The page of one command.
std::string help_page(const Command& command, const TextStyle& style);

}  // namespace coilassay

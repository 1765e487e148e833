// The command table as a man page, as Markdown and as completion for a shell.
#pragma once

#include <span>
#include <string>

#include "app/commands/option_table.h"

namespace coilassay {

/// A man page (roff, man macros) of all commands: "coilassay man | man -l -".
std::string man_page(std::span<const Command> commands, std::string_view version);

/// docs/commands.md.
std::string markdown_reference(std::span<const Command> commands);

/// Completion for bash: "source <(coilassay completion bash)".
std::string bash_completion(std::span<const Command> commands);

}  // namespace coilassay

// From the words of a command line to an exit code.
#pragma once

#include <string>
#include <vector>

#include "app/commands/option_table.h"

namespace coilassay {

/// Runs the command the words name. Results go to standard output; an error goes to standard error or, with --json, as
/// one document to standard output. Output that could not be written is exit code 2, unless its reader simply went
/// away.
int run_program(const std::vector<std::string>& words, Console& console);

/// The command of that name, or all of its family: "simulate" names "simulate ringdown".
std::vector<const Command*> commands_named(const std::string& name);

/// usage, with the nearest command there is.
tl::unexpected<Error> no_such_command(const std::string& typed);

/// Which exit code a failure means.
ExitCode exit_code_of(Problem problem);

}  // namespace coilassay

// Every command of the program.
#pragma once

#include <span>

#include "app/commands/option_table.h"

namespace coilassay {

/// In the order of the overview. A new command is its own file and one line in command_list.cpp.
std::span<const Command> commands();

/// nullptr when there is none of that name ("simulate ringdown").
const Command* find_command(std::string_view name);

// One declaration per command file.
Command inspect_command();
Command describe_command();
Command ring_down_command();
Command sine_command();
Command sweep_command();
Command simulate_ring_down_command();
Command ramp_command();
Command simulate_ramp_command();
Command simulate_sine_command();
Command simulate_sweep_command();
Command simulate_burst_command();
Command fixture_command();
Command resistance_command();
Command simulate_resistance_command();
Command ledger_list_command();
Command ledger_show_command();
Command ledger_verify_command();
Command ledger_export_command();
Command ledger_correct_command();
Command acquire_command();
Command station_command();
Command simulate_instrument_command();
Command gauge_command();
Command coupling_command();
Command simulate_coupled_command();
Command help_command();
Command man_command();
Command completion_command();

}  // namespace coilassay

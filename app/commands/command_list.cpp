#include "app/commands/command_list.h"

#include <vector>

namespace coilassay {

std::span<const Command> commands() {
  static const std::vector<Command> all = {
      describe_command(), ring_down_command(), sine_command(), sweep_command(), simulate_ring_down_command(),
      inspect_command(),
      resistance_command(), simulate_resistance_command(), ramp_command(), simulate_ramp_command(), simulate_sine_command(), simulate_sweep_command(), simulate_burst_command(), fixture_command(),
      coupling_command(), simulate_coupled_command(),
      ledger_list_command(), ledger_show_command(), ledger_verify_command(), ledger_export_command(), ledger_correct_command(),
      acquire_command(), station_command(), simulate_instrument_command(),
      gauge_command(), help_command(), man_command(), completion_command(),
  };
  return all;
}

const Command* find_command(std::string_view name) {
  for (const Command& command : commands()) {
    if (command.name == name) return &command;
  }
  return nullptr;
}

}  // namespace coilassay

#include "app/commands/command_list.h"

#include <vector>

namespace coilassay {

std::span<const Command> commands() {
  // In the order of help: look, measure, judge and keep, talk to instruments, try out.
  static const std::vector<Command> all = {
      describe_command(),
      ring_down_command(),
      sweep_command(),
      sine_command(),
      ramp_command(),
      coupling_command(),
      resistance_command(),
      fixture_command(),
      inspect_command(),
      gauge_command(),
      ledger_list_command(),
      ledger_show_command(),
      ledger_verify_command(),
      ledger_export_command(),
      ledger_correct_command(),
      station_command(),
      acquire_command(),
      simulate_ring_down_command(),
      simulate_sweep_command(),
      simulate_burst_command(),
      simulate_sine_command(),
      simulate_ramp_command(),
      simulate_coupled_command(),
      simulate_resistance_command(),
      simulate_instrument_command(),
      help_command(),
      man_command(),
      completion_command(),
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

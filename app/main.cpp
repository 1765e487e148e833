// coilassay: measures and judges inductors from captured waveforms and sweeps.
#include <unistd.h>

#include <exception>
#include <iostream>
#include <ostream>
#include <string>
#include <vector>

#include "app/commands/console.h"
#include "app/commands/descriptor_buffer.h"
#include "app/commands/process.h"
#include "app/commands/program.h"

int main(int argc, char** argv) {
  using namespace coilassay;
  prepare_process();
  try {
    DescriptorBuffer standard_output(STDOUT_FILENO);
    std::ostream out(&standard_output);
    Console console(out, std::cerr, surroundings_of_process(), system_clock_now);
    return run_program(std::vector<std::string>(argv + (argc > 0 ? 1 : 0), argv + argc), console);
  } catch (const std::exception& error) {
    std::cerr << "coilassay: this is a bug in the program, the input is not to blame (" << error.what()
              << ")\n  try: report it with the command line and the input\n";
  }
  return static_cast<int>(ExitCode::unusable);
}

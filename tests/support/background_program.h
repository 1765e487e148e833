// The program under test running beside the test: lines are read from it and written to it while it runs.
#pragma once

#include <sys/types.h>

#include <chrono>
#include <optional>
#include <string>
#include <vector>

#include "tests/support/program.h"

namespace coilassay::test {

class BackgroundProgram {
 public:
  /// Standard error goes into `error_file` of a folder of its own.
  explicit BackgroundProgram(const std::vector<std::string>& arguments, const std::vector<std::string>& environment = {});
  ~BackgroundProgram();
  BackgroundProgram(const BackgroundProgram&) = delete;
  BackgroundProgram& operator=(const BackgroundProgram&) = delete;

  /// The next line of its standard output without the line feed; nullopt at its end or when none comes in time.
  std::optional<std::string> line(std::chrono::milliseconds patience = std::chrono::seconds(20));
  /// Everything up to the end of its standard output.
  std::string rest();
  void say(const std::string& text);
  void end_of_input();
  void send(int signal) const;
  /// Waits for its end; -1 when a signal ended it.
  int exit_code();
  std::string error_text() const;

 private:
  TemporaryFolder folder_;
  pid_t child_ = -1;
  int in_ = -1, out_ = -1;
  std::string buffer_;
};

/// "simulate instrument" on a port of its own.
class SimulatedInstrument {
 public:
  explicit SimulatedInstrument(const std::string& profile, std::vector<std::string> more = {});
  const std::string& port() const { return port_; }
  BackgroundProgram& program() { return program_; }

 private:
  BackgroundProgram program_;
  std::string port_;
};

}  // namespace coilassay::test

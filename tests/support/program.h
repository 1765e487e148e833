// Runs the program under test as its users do: as a process of its own.
#pragma once

#include <chrono>
#include <string>
#include <vector>

namespace coilassay::test {

struct ProgramStart {
  std::vector<std::string> arguments = {};
  std::string input = {};                     // on standard input
  std::vector<std::string> environment = {};  // "NAME=value", on top of PATH and a UTF-8 locale
  std::string out_file = {};                  // standard output goes there instead of being collected
  bool out_closed = false;                    // the program begins with standard output closed
  bool out_abandoned = false;                 // nobody reads: a write raises a broken pipe
  bool as_nobody = false;                     // started by root: without root's rights
  std::chrono::seconds patience{60};
};

struct ProgramEnd {
  int exit_code = -1;  // -1: it did not end by itself
  int signal = 0;      // that ended it
  bool too_slow = false;
  std::string out, error;
};

/// Starts the program and waits for its end; what runs longer than `patience` is killed.
ProgramEnd run_program_process(const ProgramStart& start);
ProgramEnd run_program_process(std::vector<std::string> arguments);

/// A folder of its own for one test, removed with everything in it.
class TemporaryFolder {
 public:
  TemporaryFolder();
  ~TemporaryFolder();
  TemporaryFolder(const TemporaryFolder&) = delete;
  TemporaryFolder& operator=(const TemporaryFolder&) = delete;
  const std::string& path() const { return path_; }
  std::string operator/(const std::string& name) const { return path_ + "/" + name; }
  /// Writes a file and gives its path.
  std::string file(const std::string& name, const std::string& contents) const;

 private:
  std::string path_;
};

std::string contents_of(const std::string& path);

}  // namespace coilassay::test

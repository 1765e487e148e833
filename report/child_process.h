// Programs run as children: never through a shell, never longer than a limit, never in a folder that stays behind.
#pragma once

#include <chrono>
#include <filesystem>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "base/result.h"

namespace coilassay {

/// An empty folder that only this user can read, removed with everything in it when the object goes.
class ScratchFolder {
 public:
  /// cannot_write when no temporary folder can be made.
  static Result<ScratchFolder> make();
  ~ScratchFolder();
  ScratchFolder(ScratchFolder&& other) noexcept;
  ScratchFolder& operator=(ScratchFolder&&) = delete;

  const std::filesystem::path& path() const { return path_; }

 private:
  explicit ScratchFolder(std::filesystem::path path) : path_(std::move(path)) {}
  std::filesystem::path path_;
};

struct ChildRequest {
  std::string program;                 // absolute path, see find_program()
  std::vector<std::string> arguments;  // without the program's own name
  std::string input;                   // given to its standard input
  std::filesystem::path folder;        // where it runs; also its HOME and TMPDIR
  std::chrono::milliseconds time_limit{20000};
  std::size_t output_limit = 64u << 20;  // bytes of standard output; more is a failure
};

struct ChildOutcome {
  int exit_code = -1;  // 128 + signal when a signal ended it
  std::string output;
  std::string messages;  // standard error, its first 64 KiB
};

/// Looks a program up in the absolute folders of PATH; an empty or relative entry of PATH is skipped, so that nothing
/// is ever started from the folder the user happens to be in.
std::optional<std::string> find_program(std::string_view name);

/// Runs a program and waits for it. It gets LC_ALL=C, PATH, and the folder as HOME and TMPDIR, and nothing else of our
/// environment or open files. At the time limit it is ended together with everything it started in its process group.
///
/// @return its outcome, whatever its exit code; or missing_helper when it cannot be started, does not end in time or
///         writes more than the limit.
Result<ChildOutcome> run_child(const ChildRequest& request);

}  // namespace coilassay

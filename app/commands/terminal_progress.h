// How far long work is, on one line of a terminal.
#pragma once

#include <functional>
#include <iosfwd>
#include <mutex>

#include "base/number_text.h"
#include "base/progress.h"

namespace coilassay {

/// Shows nothing during the first second, then a line that replaces itself and is gone at the end. May be called from
/// several threads.
class TerminalProgress final : public Progress {
 public:
  /// @param seconds  a clock that never goes backwards
  TerminalProgress(std::ostream& terminal, Script script, std::size_t width, std::function<double()> seconds);
  ~TerminalProgress() override;
  TerminalProgress(const TerminalProgress&) = delete;
  TerminalProgress& operator=(const TerminalProgress&) = delete;

  bool advance(std::string_view what, std::uint64_t done, std::uint64_t total) override;

 private:
  std::mutex busy_;
  std::ostream& terminal_;
  Script script_;
  std::size_t width_;
  std::function<double()> seconds_;
  double begun_, shown_at_;
  bool shown_ = false;
};

}  // namespace coilassay

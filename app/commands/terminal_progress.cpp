#include "app/commands/terminal_progress.h"

#include <ostream>

#include "base/outside_text.h"
#include "report/text_layout.h"

namespace coilassay {

namespace {

constexpr double kPatience_s = 1;  // work that is done by then needs no line
constexpr double kBetweenLines_s = 0.1;

}  // namespace

TerminalProgress::TerminalProgress(std::ostream& terminal, Script script, std::size_t width,
                                   std::function<double()> seconds)
    : terminal_(terminal),
      script_(script),
      width_(width),
      seconds_(std::move(seconds)),
      begun_(seconds_()),
      shown_at_(begun_) {}

TerminalProgress::~TerminalProgress() {
  if (shown_) terminal_ << "\r\x1b[K" << std::flush;
}

bool TerminalProgress::advance(std::string_view what, std::uint64_t done, std::uint64_t total) {
  const std::lock_guard<std::mutex> lock(busy_);
  const double now = seconds_();
  if (now - begun_ < kPatience_s || (shown_ && now - shown_at_ < kBetweenLines_s)) return true;
  shown_ = true;
  shown_at_ = now;
  std::string line = in_script(shown(what, width_ > 20 ? width_ - 10 : 10), script_);
  if (total > 0) {
    const double share = static_cast<double>(done) / static_cast<double>(total);
    line += ' ' + std::to_string(static_cast<int>(100 * (share < 1 ? share : 1))) + " %";
  }
  terminal_ << "\r\x1b[K" << line << std::flush;
  return true;
}

}  // namespace coilassay

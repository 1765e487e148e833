#include "app/runs/line_source.h"

#include <poll.h>
#include <unistd.h>

#include <array>
#include <cerrno>

namespace coilassay {

namespace {

constexpr std::size_t kLongestLine = 4096;

}  // namespace

LineSource::Came DescriptorLines::next(std::string& line, std::chrono::milliseconds patience) {
  const auto deadline = std::chrono::steady_clock::now() + patience;
  for (;;) {
    if (const std::size_t end = buffer_.find('\n'); end != std::string::npos) {
      line = buffer_.substr(0, end);
      buffer_.erase(0, end + 1);
      if (!line.empty() && line.back() == '\r') line.pop_back();
      if (too_long_ || line.size() > kLongestLine) line = line.substr(0, kLongestLine) + '\0';
      too_long_ = false;
      return Came::line;
    }
    if (buffer_.size() > kLongestLine) {
      buffer_.resize(kLongestLine);
      too_long_ = true;
    }
    if (ended_) {
      if (buffer_.empty()) return Came::ended;
      line = std::move(buffer_);
      buffer_.clear();
      return Came::cut_end;
    }
    const auto left = std::chrono::ceil<std::chrono::milliseconds>(deadline - std::chrono::steady_clock::now());
    pollfd wait{descriptor_, POLLIN, 0};
    const int ready = poll(&wait, 1, left.count() > 0 ? static_cast<int>(left.count()) : 0);
    if (ready < 0) return Came::nothing;  // a signal: whoever waits looks whether to stop
    if (ready == 0) return Came::nothing;
    std::array<char, 4096> block{};
    const ssize_t got = read(descriptor_, block.data(), block.size());
    if (got < 0 && errno == EINTR) return Came::nothing;
    if (got <= 0) ended_ = true;
    else if (too_long_ && buffer_.size() >= kLongestLine) {
      // Only its end is looked for any more.
      const std::string more(block.data(), static_cast<std::size_t>(got));
      if (const std::size_t end = more.find('\n'); end != std::string::npos) buffer_ += more.substr(end);
    } else {
      buffer_.append(block.data(), static_cast<std::size_t>(got));
    }
  }
}

}  // namespace coilassay

#include "acquire/instrument/played_session.h"

#include <algorithm>
#include <fstream>
#include <thread>
#include <vector>

#include "acquire/instrument/byte_log.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

constexpr std::size_t kLargestLog = std::size_t{64} << 20;

struct Event {
  double at_s = 0;
  bool sent = false;
  std::string bytes;
};

class PlayedSession final : public ByteStream {
 public:
  PlayedSession(std::string name, std::vector<Event> events)
      : name_(std::move(name)), events_(std::move(events)), anchor_(std::chrono::steady_clock::now()) {
    if (!events_.empty()) anchor_s_ = events_.front().at_s;
  }

  const std::string& name() const override { return name_; }

  Result<void> write(std::string_view bytes, Span) override {
    while (!bytes.empty()) {
      // Whatever had come before this was sent, and was not fetched, is there too: it waits in the line.
      while (next_ < events_.size() && !events_[next_].sent) waiting_ += events_[next_++].bytes;
      if (next_ == events_.size()) return lost("the recorded session ends before '" + shown(bytes, 60) + "' is sent");
      const Event& event = events_[next_];
      const std::string_view rest = std::string_view(event.bytes).substr(of_event_);
      const std::size_t same = std::min(rest.size(), bytes.size());
      if (rest.substr(0, same) != bytes.substr(0, same)) {
        return lost("'" + shown(bytes, 60) + "' is sent, where '" + shown(rest, 60) + "' was sent then");
      }
      bytes.remove_prefix(same);
      of_event_ += same;
      if (of_event_ == event.bytes.size()) {
        anchor_ = std::chrono::steady_clock::now();
        anchor_s_ = event.at_s;
        of_event_ = 0;
        ++next_;
      }
    }
    return {};
  }

  Result<std::size_t> read(std::span<char> into, Span patience) override {
    const SteadyTime deadline = std::chrono::steady_clock::now() + patience;
    for (;;) {
      const SteadyTime now = std::chrono::steady_clock::now();
      while (next_ < events_.size() && !events_[next_].sent && due(events_[next_]) <= now) waiting_ += events_[next_++].bytes;
      if (!waiting_.empty()) {
        const std::size_t n = std::min(into.size(), waiting_.size());
        std::copy_n(waiting_.begin(), n, into.begin());
        waiting_.erase(0, n);
        return n;
      }
      if (now >= deadline) return 0;
      SteadyTime until = deadline;
      if (next_ < events_.size() && !events_[next_].sent) until = std::min(until, due(events_[next_]));
      std::this_thread::sleep_until(until);
    }
  }

 private:
  SteadyTime due(const Event& event) const {
    return anchor_ + std::chrono::duration_cast<Span>(std::chrono::duration<double>(event.at_s - anchor_s_));
  }
  tl::unexpected<Error> lost(std::string finding) const {
    return failure(Problem::instrument, name_, std::move(finding), "play it with the profile it was recorded with");
  }

  std::string name_;
  std::vector<Event> events_;
  std::size_t next_ = 0, of_event_ = 0;
  std::string waiting_;
  SteadyTime anchor_;
  double anchor_s_ = 0;
};

}  // namespace

Result<std::unique_ptr<ByteStream>> open_played_session(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  if (!file) return failure(Problem::unreadable, path, "the recorded session cannot be read", "give a log made with --trace");
  std::vector<Event> events;
  std::size_t number = 0, total = 0;
  for (std::string line; std::getline(file, line);) {
    ++number;
    total += line.size();
    if (line.empty() || line.front() == '#') continue;
    const std::size_t start = line.find_first_not_of(' ');
    const std::size_t mark = start == std::string::npos ? start : line.find(' ', start);
    bool fine = mark != std::string::npos && mark + 2 < line.size() && (line[mark + 1] == '>' || line[mark + 1] == '<') &&
                line[mark + 2] == ' ' && total <= kLargestLog;
    Event event;
    if (fine) {
      const auto at = parse_plain_number(std::string_view(line).substr(start, mark - start));
      fine = at.has_value();
      event.at_s = at.value_or(0);
      event.sent = line[mark + 1] == '>';
      event.bytes = unescaped_bytes(std::string_view(line).substr(mark + 3), fine);
    }
    if (!fine) {
      return failure(Problem::damaged, path + ":" + std::to_string(number), "this is no line of a recorded session",
                     "give a log made with --trace, as it was written");
    }
    events.push_back(std::move(event));
  }
  return std::make_unique<PlayedSession>(path, std::move(events));
}

}  // namespace coilassay

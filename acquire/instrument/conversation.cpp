#include "acquire/instrument/conversation.h"

#include <algorithm>
#include <array>
#include <thread>

#include "acquire/instrument/block.h"
#include "acquire/instrument/pattern.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using Clock = std::chrono::steady_clock;

constexpr std::size_t kLongestLine = std::size_t{64} << 10;
constexpr std::size_t kReadAtOnce = 65536;

Span span_of(double seconds) { return std::chrono::duration_cast<Span>(std::chrono::duration<double>(seconds)); }

std::string in_words(double seconds) {
  if (seconds < 1) return std::to_string(static_cast<int>(seconds * 1000 + 0.5)) + " ms";
  return std::to_string(static_cast<int>(seconds + 0.5)) + " s";
}

}  // namespace

bool may_be_tried_again(Trouble trouble) {
  switch (trouble) {
    case Trouble::silent:
    case Trouble::cut_short:
    case Trouble::too_long:
    case Trouble::extra_bytes:
    case Trouble::unreadable:
    case Trouble::lost: return true;
    case Trouble::gone:
    case Trouble::other_identity:
    case Trouble::never_quiet:
    case Trouble::stopped: break;
  }
  return false;
}

Conversation::Conversation(LinkSetup link, std::optional<IdentitySetup> identity, StreamOpener opener, std::function<bool()> stopped)
    : link_(std::move(link)), identity_(std::move(identity)), opener_(std::move(opener)), stopped_(std::move(stopped)) {}

Upset Conversation::upset(Trouble trouble, std::string finding, std::string remedy) const {
  const bool by_user = trouble == Trouble::stopped;
  if (remedy.empty() && !by_user) remedy = "coilassay acquire --try PROFILE.toml shows the talk step by step";
  return {trouble, {by_user ? Problem::interrupted : Problem::instrument, link_.port, std::move(finding), std::move(remedy)}};
}

Upset Conversation::lost(const Error& error) {
  stream_.reset();
  buffer_.clear();
  trusted_ = false;
  distrusted_at_ = Clock::now();
  return {Trouble::lost, error};
}

void Conversation::distrust() {
  ++counts_.unreadable;
  trusted_ = false;
  distrusted_at_ = Clock::now();
}

Answer<void> Conversation::open(bool prints_unasked) {
  unasked_ = prints_unasked;
  auto stream = opener_();
  if (!stream) return tl::make_unexpected(Upset{Trouble::gone, stream.error()});
  stream_ = std::move(*stream);
  distrusted_at_ = Clock::now();
  return settle();
}

/// Makes the line trusted, opening it again where it was lost.
Answer<void> Conversation::settle() {
  const SteadyTime since = Clock::now();
  std::optional<Upset> last;
  for (int round = 0; !trusted_; ++round) {
    if (was_stopped()) return tl::make_unexpected(upset(Trouble::stopped, "stopped"));
    // Three rounds whatever they take; a silent instrument, perhaps switched off, for as long as is waited for a lost one.
    const bool in_time = Clock::now() - since < span_of(link_.reconnect_s);
    if (round >= 3 && (!in_time || last->trouble == Trouble::other_identity)) {
      if (last->trouble != Trouble::other_identity) last->trouble = Trouble::gone;
      return tl::make_unexpected(*last);
    }
    if (!stream_) {
      if (auto opened = reopen(since); !opened) return opened;
    }
    if (unasked_) break;  // it never falls silent, and is never asked
    ++counts_.resynchronisations;
    auto done = silence(distrusted_at_ + span_of(link_.lateness_s));
    if (done) done = identify();
    if (done) {
      trusted_ = true;
    } else if (done.error().trouble == Trouble::never_quiet || done.error().trouble == Trouble::stopped) {
      return done;
    } else {
      last = done.error();
      distrusted_at_ = Clock::now();
    }
  }
  return {};
}

Answer<void> Conversation::reopen(SteadyTime since) {
  for (;;) {
    auto stream = opener_();
    if (stream) {
      stream_ = std::move(*stream);
      ++counts_.reconnections;
      distrusted_at_ = Clock::now();
      return {};
    }
    if (Clock::now() - since >= span_of(link_.reconnect_s)) {
      Error error = stream.error();
      error.finding = "the instrument is gone: " + error.finding;
      return tl::make_unexpected(Upset{Trouble::gone, std::move(error)});
    }
    if (was_stopped()) return tl::make_unexpected(upset(Trouble::stopped, "stopped"));
    std::this_thread::sleep_for(kSlice);
  }
}

/// Listens until `until` and then until the line has been quiet, throwing away what comes.
Answer<void> Conversation::silence(SteadyTime until) {
  const Span quiet = span_of(link_.quiet_s);
  const Span most = std::max<Span>(std::chrono::seconds(1), 5 * span_of(link_.lateness_s));
  buffer_.clear();
  const SteadyTime begun = Clock::now();
  SteadyTime last_byte = begun;
  std::array<char, 4096> block{};
  for (;;) {
    const SteadyTime now = Clock::now();
    const SteadyTime end = std::max(until, last_byte + quiet);
    if (now >= end) {
      // This process may have slept while bytes came: it was quiet only if nothing waits either.
      const auto waiting = drained();
      if (!waiting) return tl::make_unexpected(waiting.error());
      if (*waiting == 0) return {};
      last_byte = Clock::now();
    }
    if (now > std::max(until, begun) + most) {
      return tl::make_unexpected(upset(Trouble::never_quiet, "it talks without being asked and without end",
                                       "leave 'ask' out of [reading] if it prints lines by itself"));
    }
    if (was_stopped()) return tl::make_unexpected(upset(Trouble::stopped, "stopped"));
    auto got = stream_->read(block, std::clamp<Span>(end - now, Span::zero(), kSlice));
    if (!got) return tl::make_unexpected(lost(got.error()));
    if (*got > 0) {
      counts_.stale_bytes += *got;
      last_byte = Clock::now();
    }
  }
}

/// What waits in the line this very moment, thrown away.
Answer<std::size_t> Conversation::drained() {
  std::array<char, 4096> block{};
  std::size_t all = buffer_.size();
  buffer_.clear();
  for (std::size_t blocks = 0; blocks < 4096; ++blocks) {
    auto got = stream_->read(block, Span::zero());
    if (!got) return tl::make_unexpected(lost(got.error()));
    if (*got == 0) break;
    all += *got;
  }
  counts_.stale_bytes += all;
  return all;
}

Answer<void> Conversation::identify() {
  if (!identity_) return expect_quiet();
  const SteadyTime deadline = Clock::now() + span_of(link_.timeout_s);
  if (auto sent = send(identity_->ask); !sent) return sent;
  auto line = take_line(deadline);
  if (!line) return tl::make_unexpected(line.error());
  if (auto quiet = expect_quiet(); !quiet) return quiet;
  const auto pattern = Pattern::compile(identity_->expect, "identity.expect");
  if (!pattern) return tl::make_unexpected(Upset{Trouble::other_identity, pattern.error()});
  if (!pattern->found_in(*line)) {
    return tl::make_unexpected(upset(Trouble::other_identity, "the instrument says it is '" + shown(*line, 80) + "', where '" + shown(identity_->expect, 60) + "' is expected",
                                     "connect the right instrument, or write what it says under [identity] expect"));
  }
  if (identity_text_.empty()) identity_text_ = *line;
  if (identity_text_ != *line) {
    return tl::make_unexpected(upset(Trouble::other_identity, "another instrument answers: '" + shown(*line, 80) + "' instead of '" + shown(identity_text_, 80) + "'",
                                     "connect the one that was there at the start, or begin again"));
  }
  return {};
}

Answer<void> Conversation::send(std::string_view text) {
  std::string line(text);
  line += link_.terminator;
  if (auto sent = stream_->write(line, span_of(link_.timeout_s)); !sent) return tl::make_unexpected(lost(sent.error()));
  if (!link_.echo) return {};
  auto echoed = take_line(Clock::now() + span_of(link_.timeout_s));
  if (!echoed) return tl::make_unexpected(echoed.error());
  if (*echoed != text) {
    return tl::make_unexpected(upset(Trouble::unreadable, "it was to send back '" + shown(text, 60) + "', and sent '" + shown(*echoed, 60) + "'"));
  }
  return {};
}

/// Waits for more bytes: until the deadline, and no longer than the pause a reply may have once it has begun.
Answer<void> Conversation::fill(SteadyTime deadline) {
  std::array<char, kReadAtOnce> block;
  const bool begun = !buffer_.empty();
  SteadyTime end = deadline;
  if (begun) end = std::min(end, Clock::now() + span_of(link_.byte_timeout_s));
  for (;;) {
    if (was_stopped()) return tl::make_unexpected(upset(Trouble::stopped, "stopped"));
    const SteadyTime now = Clock::now();
    if (now >= end) {
      ++counts_.timeouts;
      if (!begun) return tl::make_unexpected(upset(Trouble::silent, "no reply within " + in_words(link_.timeout_s), "is it switched on, and do port, baud and terminator fit? coilassay acquire --try PROFILE.toml shows"));
      return tl::make_unexpected(upset(Trouble::cut_short, "the reply has no end: '" + shown(buffer_, 80) + "'", "does the terminator fit? coilassay acquire --try PROFILE.toml shows the talk step by step"));
    }
    auto got = stream_->read(block, std::min<Span>(end - now, kSlice));
    if (!got) return tl::make_unexpected(lost(got.error()));
    if (*got > 0) {
      buffer_.append(block.data(), *got);
      return {};
    }
  }
}

Answer<std::string> Conversation::take_line(SteadyTime deadline) {
  std::size_t searched = 0;
  for (;;) {
    const std::size_t from = searched < link_.reply_terminator.size() ? 0 : searched - link_.reply_terminator.size();
    if (const std::size_t end = buffer_.find(link_.reply_terminator, from); end != std::string::npos && end <= kLongestLine) {
      std::string line = buffer_.substr(0, end);
      buffer_.erase(0, end + link_.reply_terminator.size());
      while (!line.empty() && (line.back() == '\r' || line.back() == ' ')) line.pop_back();
      return line;
    }
    searched = buffer_.size();
    if (buffer_.size() > kLongestLine) {
      buffer_.clear();
      return tl::make_unexpected(upset(Trouble::too_long, "more than 64 KiB came without a terminator", "look at terminator and baud in the profile"));
    }
    if (auto more = fill(deadline); !more) return tl::make_unexpected(more.error());
  }
}

Answer<void> Conversation::expect_quiet() {
  std::size_t extra = buffer_.size();
  buffer_.clear();
  std::array<char, 4096> block{};
  if (extra == 0) {
    auto got = stream_->read(block, span_of(link_.quiet_s));
    if (!got) return tl::make_unexpected(lost(got.error()));
    extra = *got;
  }
  if (extra == 0) return {};
  counts_.stale_bytes += extra;
  return tl::make_unexpected(upset(Trouble::extra_bytes, "more came after the reply: it is not certain which one is the answer"));
}

/// One question and its reply on a trusted line; the line is not trusted after any upset.
Answer<void> Conversation::transact(std::string_view question, const Take& take) {
  for (int looked = 0;; ++looked) {
    if (auto fine = settle(); !fine) return fine;
    const auto stale = drained();
    if (!stale && stale.error().trouble != Trouble::lost) return tl::make_unexpected(stale.error());
    if (stale && *stale == 0) break;
    trusted_ = false;
    distrusted_at_ = Clock::now();
    if (looked == 3) {
      return tl::make_unexpected(upset(Trouble::never_quiet, "it talks without being asked", "leave 'ask' out of [reading] if it prints lines by itself"));
    }
  }
  ++counts_.transactions;
  const SteadyTime deadline = Clock::now() + span_of(link_.timeout_s);
  auto done = send(question);
  if (done) done = take(deadline);
  if (done) done = expect_quiet();
  if (!done) {
    if (done.error().trouble == Trouble::extra_bytes || done.error().trouble == Trouble::unreadable || done.error().trouble == Trouble::too_long) ++counts_.unreadable;
    trusted_ = false;
    distrusted_at_ = Clock::now();
  }
  return done;
}

Answer<std::string> Conversation::ask(std::string_view question) {
  std::string line;
  const auto done = transact(question, [&](SteadyTime deadline) -> Answer<void> {
    auto taken = take_line(deadline);
    if (!taken) return tl::make_unexpected(taken.error());
    line = std::move(*taken);
    return {};
  });
  if (!done) return tl::make_unexpected(done.error());
  return line;
}

Answer<std::vector<std::string>> Conversation::ask_rows(std::string_view question, std::size_t rows) {
  std::vector<std::string> lines;
  lines.reserve(rows);
  const auto done = transact(question, [&](SteadyTime) -> Answer<void> {
    while (lines.size() < rows) {
      // Each row has the whole time: a long record takes longer than a reading.
      auto taken = take_line(Clock::now() + span_of(link_.timeout_s));
      if (!taken) return tl::make_unexpected(taken.error());
      lines.push_back(std::move(*taken));
    }
    return {};
  });
  if (!done) return tl::make_unexpected(done.error());
  return lines;
}

Answer<std::string> Conversation::ask_block(std::string_view question, std::size_t largest) {
  std::string payload;
  const auto done = transact(question, [&](SteadyTime deadline) -> Answer<void> {
    BlockHeader header;
    HeaderState state = HeaderState::needs_more;
    while ((state = read_block_header(buffer_, header)) == HeaderState::needs_more) {
      if (auto more = fill(deadline); !more) return more;
    }
    if (state == HeaderState::no_block || header.payload_bytes > largest) {
      const std::string finding = state == HeaderState::no_block ? "the reply is no definite-length block: '" + shown(buffer_, 40) + "'"
                                                                 : "a block of " + std::to_string(header.payload_bytes) + " bytes is announced where at most " + std::to_string(largest) + " are stated";
      return tl::make_unexpected(upset(Trouble::unreadable, finding, "look at format and count in [record]"));
    }
    const std::size_t whole = header.header_bytes + header.payload_bytes;
    while (buffer_.size() < whole) {
      if (auto more = fill(Clock::now() + span_of(link_.timeout_s)); !more) return more;
    }
    payload = buffer_.substr(header.header_bytes, header.payload_bytes);
    buffer_.erase(0, whole);
    // Most send a terminator after it; some on serial lines do not. It is no extra byte.
    if (buffer_.empty()) {
      std::array<char, 16> end{};
      auto got = stream_->read(end, span_of(link_.quiet_s));
      if (!got) return tl::make_unexpected(lost(got.error()));
      buffer_.append(end.data(), *got);
    }
    for (const std::string& end : {link_.reply_terminator, std::string("\r\n"), std::string("\n")}) {
      if (!buffer_.starts_with(end)) continue;
      buffer_.erase(0, end.size());
      break;
    }
    return {};
  });
  if (!done) return tl::make_unexpected(done.error());
  return payload;
}

Answer<std::string> Conversation::next_line() {
  if (auto fine = settle(); !fine) return tl::make_unexpected(fine.error());
  ++counts_.transactions;
  if (auto rest = drained(); !rest) return tl::make_unexpected(rest.error());
  // The first line may have begun before: only what follows its end is whole. A line that begins after a pause is whole
  // itself, but nothing tells that from one whose first half was just thrown away.
  const SteadyTime deadline = Clock::now() + span_of(link_.timeout_s);
  if (auto part = take_line(deadline); !part) return part;
  return take_line(Clock::now() + span_of(link_.timeout_s));
}

Answer<void> Conversation::tell(std::string_view command) {
  if (auto fine = settle(); !fine) return fine;
  return send(command);
}

}  // namespace coilassay

#include "acquire/byte_source_digest.h"

#include <algorithm>
#include <cstring>
#include <new>

#include "acquire/read_block.h"

namespace coilassay {

DigestedBytes::DigestedBytes(ByteSource& inner) : inner_(inner), reader_([this] { read_ahead(); }) {}

DigestedBytes::~DigestedBytes() {
  if (!reader_.joinable()) return;
  {
    const std::lock_guard guard(lock_);
    stop_ = true;
  }
  changed_.notify_all();
  inner_.stop();  // a pipe whose writer says nothing would keep the thread for ever
  reader_.join();
}

void DigestedBytes::read_ahead() {
  for (std::size_t n = 0;; ++n) {
    {
      std::unique_lock hold(lock_);
      changed_.wait(hold, [&] { return stop_ || n < passed_ + kRing; });
      if (stop_) return;
    }
    std::vector<char>& block = ring_[n % kRing];
    const auto got = fill(block);
    block.resize(got ? *got : 0);
    const bool more = got && *got > 0;
    {
      const std::lock_guard guard(lock_);
      if (!got) error_ = got.error();
      if (more) ++filled_;
      ended_ = !more;
    }
    changed_.notify_all();
    if (!more) return;
    sha256_.add(block);  // beside the reading of the same bytes
  }
}

/// An exception must not leave the reading thread.
Result<std::size_t> DigestedBytes::fill(std::vector<char>& block) {
  try {
    block.resize(kReadBlock);
    return inner_.read(block);
  } catch (const std::bad_alloc&) {
    return failure(Problem::unreadable, name(), "there is not enough memory to read it", "close other programs and try again");
  }
}

Result<bool> DigestedBytes::block_is_there() {
  std::unique_lock hold(lock_);
  changed_.wait(hold, [this] { return passed_ < filled_ || ended_; });
  if (passed_ < filled_) return true;
  if (error_) return tl::make_unexpected(*error_);
  return false;
}

Result<std::size_t> DigestedBytes::read(std::span<char> into) {
  std::size_t done = 0;
  while (done < into.size()) {
    const auto there = block_is_there();
    if (!there) return failure(there);
    if (!*there) break;
    const std::vector<char>& block = ring_[passed_ % kRing];
    const std::size_t count = std::min(into.size() - done, block.size() - given_);
    std::memcpy(into.data() + done, block.data() + given_, count);
    done += count;
    given_ += count;
    if (given_ == block.size()) {
      given_ = 0;
      const std::lock_guard guard(lock_);
      ++passed_;
      changed_.notify_all();
    }
  }
  passed_on_ += done;
  return done;
}

Result<void> DigestedBytes::drain() {
  std::vector<char> block(std::size_t{1} << 16U);
  for (;;) {
    const auto got = read(block);
    if (!got) return failure(got);
    if (*got == 0) return {};
  }
}

std::string DigestedBytes::digest() {
  reader_.join();
  return sha256_.finish();
}

}  // namespace coilassay

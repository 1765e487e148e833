// The digest of a stream, taken of the blocks that are read anyway by a thread that reads ahead.
#pragma once

#include <array>
#include <condition_variable>
#include <mutex>
#include <optional>
#include <string>
#include <thread>
#include <vector>

#include "acquire/reader.h"
#include "base/digest.h"

namespace coilassay {

/// Passes on the bytes of another source, which a thread of its own reads and digests, a few blocks ahead.
class DigestedBytes final : public ByteSource {
 public:
  explicit DigestedBytes(ByteSource& inner);
  ~DigestedBytes() override;
  DigestedBytes(const DigestedBytes&) = delete;
  DigestedBytes& operator=(const DigestedBytes&) = delete;

  const std::string& name() const override { return inner_.name(); }
  std::size_t size_hint() const override { return inner_.size_hint(); }
  Result<std::size_t> read(std::span<char> into) override;
  void stop() override { inner_.stop(); }

  /// Reads what is left, so that digest and size are those of the whole file; then they can be asked for, once.
  Result<void> drain();
  std::size_t bytes() const { return passed_on_; }
  std::string digest();

 private:
  static constexpr std::size_t kRing = 6;
  void read_ahead();
  Result<std::size_t> fill(std::vector<char>& block);
  /// Waits for the block that is being passed on; false at the end of the stream.
  Result<bool> block_is_there();

  ByteSource& inner_;
  Sha256 sha256_;  // of the reading thread
  std::array<std::vector<char>, kRing> ring_;
  std::mutex lock_;
  std::condition_variable changed_;
  // Block n stands in ring_[n % kRing] while passed_ <= n < filled_; the reading thread fills n once n < passed_ + kRing.
  std::size_t filled_ = 0;
  std::size_t passed_ = 0;
  std::optional<Error> error_;
  bool ended_ = false;  // filled_ will not grow any more
  bool stop_ = false;
  std::size_t given_ = 0;  // bytes of block passed_ passed on already
  std::size_t passed_on_ = 0;
  std::thread reader_;
};

}  // namespace coilassay

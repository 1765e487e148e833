#include "acquire/byte_source_lines.h"

#include <fmt/format.h>

#include <algorithm>
#include <cstring>

namespace coilassay {

Result<void> LineBlocks::next(LineBlock& block) {
  block.size = 0;
  if (ended_) return {};
  block.bytes.resize(carry_.size() + kBlock + 1 + LineBlock::kPadding);
  std::memcpy(block.bytes.data(), carry_.data(), carry_.size());
  const auto got = source_.read(std::span(block.bytes.data() + carry_.size(), kBlock));
  if (!got) return failure(got);
  bytes_read_ += *got;
  std::size_t filled = carry_.size() + *got;
  if (*got < kBlock) {
    ended_ = true;
    if (filled > 0 && block.bytes[filled - 1] != '\n') {
      last_line_open_ = true;
      block.bytes[filled++] = '\n';
    }
    block.size = filled;
    carry_.clear();
    constexpr std::size_t kTail = 4096;
    const std::size_t tail = std::min(filled, kTail);
    tail_.assign(block.bytes.data() + filled - tail, tail);
  } else {
    const char* const begin = block.bytes.data();
    const void* const end = ::memrchr(begin, '\n', filled);
    if (end == nullptr) {
      return failure(Problem::not_a_capture, fmt::format("{}:{}", source_.name(), lines_ + 1),
                     fmt::format("a line of more than {} bytes is no row of a table", kBlock),
                     "export time and channels as columns, one sample in a row");
    }
    block.size = static_cast<std::size_t>(static_cast<const char*>(end) - begin) + 1;
    carry_.assign(begin + block.size, filled - block.size);
  }
  std::memset(block.bytes.data() + block.size, 0, LineBlock::kPadding);
  if (ended_ || carry_.size() > kBlock / 2) {  // lines are counted only where an error may need it
    lines_ += static_cast<std::size_t>(std::count(block.bytes.data(), block.bytes.data() + block.size, '\n'));
  }
  return {};
}

}  // namespace coilassay

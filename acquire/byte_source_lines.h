// A stream of bytes cut into blocks of whole lines.
#pragma once

#include <cstddef>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/read_block.h"
#include "acquire/reader.h"

namespace coilassay {

/// A block of whole lines: its last byte is a line end, and behind it stand kPadding zero bytes that may be read.
struct LineBlock {
  static constexpr std::size_t kPadding = 64;
  std::vector<char> bytes;
  std::size_t size = 0;
  std::string_view text() const { return {bytes.data(), size}; }
};

class LineBlocks {
 public:
  static constexpr std::size_t kBlock = kReadBlock;

  explicit LineBlocks(ByteSource& source) : source_(source) {}

  /// The next block; size 0 at the end. The last line gets an end when the file gives it none.
  /// damaged when a line is longer than a block.
  Result<void> next(LineBlock& block);

  std::size_t bytes_read() const { return bytes_read_; }
  /// Whether the last line of the file had no end of its own.
  bool last_line_open() const { return last_line_open_; }
  /// The last lines of the file, at most 4 KiB, once the last block has been given.
  const std::string& tail() const { return tail_; }

 private:
  ByteSource& source_;
  std::string carry_;  // the beginning of a line whose end is in the next block
  std::string tail_;
  std::size_t lines_ = 0;
  std::size_t bytes_read_ = 0;
  bool last_line_open_ = false;
  bool ended_ = false;
};

}  // namespace coilassay

// Bytes to and from one instrument. Who holds the stream owns the line: one owner, one transaction at a time.
#pragma once

#include <chrono>
#include <cstddef>
#include <functional>
#include <memory>
#include <span>
#include <string>
#include <string_view>

#include "base/result.h"

namespace coilassay {

using SteadyTime = std::chrono::steady_clock::time_point;
using Span = std::chrono::steady_clock::duration;

/// A line that is open. Every failure is Problem::instrument and means that the line is lost: the stream is of no use
/// afterwards and has to be opened anew.
class ByteStream {
 public:
  virtual ~ByteStream() = default;
  /// "/dev/ttyUSB0", "localhost:5025": outside text.
  virtual const std::string& name() const = 0;
  /// Hands all bytes over within `patience`.
  virtual Result<void> write(std::string_view bytes, Span patience) = 0;
  /// Takes what is there; waits up to `patience` (0: not at all) for the first byte. 0 bytes: nothing came.
  virtual Result<std::size_t> read(std::span<char> into, Span patience) = 0;
};

/// Opens the line, also again after it was lost.
using StreamOpener = std::function<Result<std::unique_ptr<ByteStream>>()>;

/// A loss is seen within this time, also in the middle of a long wait.
inline constexpr std::chrono::milliseconds kSlice{50};

}  // namespace coilassay

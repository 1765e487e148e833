// Lines from a scanner, a keyboard or a pipe, with a look at the clock in between.
#pragma once

#include <chrono>
#include <functional>
#include <string>

namespace coilassay {

class LineSource {
 public:
  enum class Came {
    line,
    nothing,  // in this time
    ended,
    cut_end,  // the end came in the middle of a line, which is given and must not be trusted
  };
  virtual ~LineSource() = default;
  /// Waits up to `patience`. A line has neither line feed nor carriage return; one of more than 4096 bytes is cut and
  /// marked by a last byte 0, so that nobody takes its beginning for a serial number.
  virtual Came next(std::string& line, std::chrono::milliseconds patience) = 0;
};

/// Lines of an open descriptor, which stays open.
class DescriptorLines final : public LineSource {
 public:
  explicit DescriptorLines(int descriptor) : descriptor_(descriptor) {}
  Came next(std::string& line, std::chrono::milliseconds patience) override;

 private:
  int descriptor_;
  std::string buffer_;
  bool too_long_ = false, ended_ = false;
};

}  // namespace coilassay

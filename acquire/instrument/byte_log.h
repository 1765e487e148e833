// Every byte both ways, on request: for finding out what an instrument really says, and for playing a session again.
#pragma once

#include <memory>
#include <string>
#include <string_view>

#include "acquire/instrument/byte_stream.h"

namespace coilassay {

/// A log of lines such as "   12.345678 > *IDN?\n": seconds since it was begun, > to the instrument or < from it, bytes
/// with escapes. Beyond `largest` bytes the file becomes FILE.1 and a new one is begun; an older FILE.1 goes.
class ByteLog {
 public:
  /// cannot_write: the file cannot be made. `head` is a comment on the first line.
  static Result<std::shared_ptr<ByteLog>> begin(const std::string& path, const std::string& head,
                                                std::size_t largest = std::size_t{4} << 20);
  ~ByteLog();
  ByteLog(const ByteLog&) = delete;
  ByteLog& operator=(const ByteLog&) = delete;

  void sent(std::string_view bytes) { line('>', bytes); }
  void came(std::string_view bytes) { line('<', bytes); }
  void remark(std::string_view words);

 private:
  ByteLog(std::string path, std::string head, std::size_t largest);
  bool start();
  void line(char direction, std::string_view bytes);
  void put(const std::string& text);

  std::string path_, head_;
  std::size_t largest_, written_ = 0;
  int descriptor_ = -1;
  SteadyTime begun_;
};

/// Opens by `opener` and writes everything that passes into the log.
StreamOpener logged(StreamOpener opener, std::shared_ptr<ByteLog> log);

/// Bytes as printable ASCII with \n \r \t \\ \xNN, and back; `fine` becomes false for text that no log has.
std::string escaped_bytes(std::string_view bytes);
std::string unescaped_bytes(std::string_view text, bool& fine);

}  // namespace coilassay

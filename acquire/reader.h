// One file format, one reader; a list of readers; one door for files, pipes and standard input.
#pragma once

#include <cstddef>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/capture.h"
#include "base/progress.h"
#include "base/result.h"

namespace coilassay {

/// Bytes of a file, a pipe or a decompressed stream, in blocks, forward only.
class ByteSource {
 public:
  virtual ~ByteSource() = default;
  virtual const std::string& name() const = 0;
  /// Fills all of `into` unless the stream ends before; 0 at the end.
  virtual Result<std::size_t> read(std::span<char> into) = 0;
  /// Size in bytes when known beforehand (progress), 0 otherwise.
  virtual std::size_t size_hint() const = 0;
  /// From another thread: ends a read that waits for bytes, and all later ones. Files never wait.
  virtual void stop() {}
};

/// What the caller knows about the file; everything left out is found from the bytes.
struct ReadOptions {
  std::optional<char> delimiter;
  std::optional<char> decimal;
  std::optional<double> sample_interval_s;  // for a file without time; what stands in the file is then not asked
  std::size_t skip = 0;                     // lines at the beginning that are not looked at
  /// Headings of all columns of a table, "CH1 [V]", "-" for one to leave out; empty: as in the file. A file with another
  /// number of columns, or with other names where it has names, is refused.
  std::vector<std::string> columns;
  unsigned threads = 2;           // the result does not depend on it
  Progress* progress = nullptr;   // not owned; may be null
};

/// Turns one file format into captures or a sweep. A reader never filters, corrects or fits.
class Reader {
 public:
  virtual ~Reader() = default;
  virtual std::string_view format_name() const = 0;
  /// `first_bytes` is a look at the head of the stream (4 KiB or all of it); read() gets the stream from its beginning.
  virtual bool recognises(std::string_view file_name, std::string_view first_bytes) const = 0;
  virtual Result<Recording> read(ByteSource& bytes, std::string_view first_bytes, const ReadOptions& options) const = 0;
};

/// All formats, in the order they are asked. A new format is one file and one line there.
const std::vector<std::unique_ptr<Reader>>& readers();

/// Opens a regular file or, for "-", standard input. unreadable: missing, a directory, no permission.
Result<std::unique_ptr<ByteSource>> open_bytes(const std::string& path);

/// Reads a file by the first reader that recognises it; Source (digest included) is filled in.
Result<Recording> read_recording(const std::string& path, const ReadOptions& options = {});

}  // namespace coilassay

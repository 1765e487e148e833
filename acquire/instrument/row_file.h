// A file that grows row by row and keeps what came when the program or the power goes.
#pragma once

#include <chrono>
#include <string>
#include <string_view>

#include "base/result.h"

namespace coilassay {

class RowFile {
 public:
  /// A new file, or standard output for "-". usage: there is such a file already, and what was measured is not overwritten;
  /// cannot_write: no such folder, no permission.
  static Result<RowFile> create(const std::string& path);
  ~RowFile();
  RowFile(RowFile&& other) noexcept;
  RowFile& operator=(RowFile&&) = delete;

  /// Adds whole lines with one write, so that no row is ever half there; at least once a second they are brought to the
  /// disk. cannot_write: a full disk; what was written before stays.
  Result<void> append(std::string_view lines);
  /// Brings everything to the disk.
  Result<void> finish();

 private:
  RowFile(std::string path, int descriptor, bool owned) : path_(std::move(path)), descriptor_(descriptor), owned_(owned) {}
  std::string path_;
  int descriptor_ = -1;
  bool owned_ = false;
  std::chrono::steady_clock::time_point synced_{};
};

}  // namespace coilassay

#include "acquire/instrument/row_file.h"

#include <fcntl.h>
#include <unistd.h>

#include <cerrno>
#include <system_error>
#include <utility>

namespace coilassay {

Result<RowFile> RowFile::create(const std::string& path) {
  if (path == "-") return RowFile(path, STDOUT_FILENO, false);
  const int descriptor = open(path.c_str(), O_WRONLY | O_CREAT | O_EXCL | O_APPEND | O_CLOEXEC, 0644);
  if (descriptor >= 0) return RowFile(path, descriptor, true);
  if (errno == EEXIST) {
    return failure(Problem::usage, path, "there is such a file already, and what was measured is not overwritten", "give another name with -o");
  }
  return failure(Problem::cannot_write, path, "it cannot be made: " + std::generic_category().message(errno), "give -o a place where a file can be written");
}

RowFile::RowFile(RowFile&& other) noexcept
    : path_(std::move(other.path_)), descriptor_(std::exchange(other.descriptor_, -1)), owned_(std::exchange(other.owned_, false)), synced_(other.synced_) {}

RowFile::~RowFile() {
  if (owned_ && descriptor_ >= 0) close(descriptor_);
}

Result<void> RowFile::append(std::string_view lines) {
  while (!lines.empty()) {
    const ssize_t done = write(descriptor_, lines.data(), lines.size());
    if (done < 0 && errno == EINTR) continue;
    if (done < 0) {
      return failure(Problem::cannot_write, path_, "a row could not be written: " + std::generic_category().message(errno), "make room; the rows before it are kept");
    }
    lines.remove_prefix(static_cast<std::size_t>(done));
  }
  const auto now = std::chrono::steady_clock::now();
  if (now - synced_ < std::chrono::seconds(1)) return {};
  synced_ = now;
  return finish();
}

Result<void> RowFile::finish() {
  // A pipe or a terminal has nothing to bring anywhere.
  if (!owned_ || fdatasync(descriptor_) == 0 || errno == EINVAL) return {};
  return failure(Problem::cannot_write, path_, "it could not be brought to the disk: " + std::generic_category().message(errno), "look at the disk; copy the file elsewhere");
}

}  // namespace coilassay

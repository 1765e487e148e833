#include "tests/fuzz/target.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cstdio>
#include <cstdlib>
#include <filesystem>

#include "tests/fuzz/input_file.h"

namespace coilassay::fuzz {

namespace {

/// Removed when the process ends by itself.
struct Folder {
  Folder() : path(std::filesystem::temp_directory_path() / ("coilassay-fuzz-" + std::to_string(::getpid()))) {
    std::filesystem::create_directories(path);
  }
  ~Folder() {
    std::error_code ignored;
    std::filesystem::remove_all(path, ignored);
  }
  std::filesystem::path path;
};

}  // namespace

void require(bool holds, const char* what) {
  if (holds) return;
  std::fprintf(stderr, "a property does not hold: %s\n", what);
  std::abort();
}

std::string input_file(const std::string& name, std::string_view bytes) {
  static const Folder folder;
  const std::string path = (folder.path / name).string();
  const int file = ::open(path.c_str(), O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0600);
  require(file >= 0, "there is room for a file");
  require(::write(file, bytes.data(), bytes.size()) == static_cast<ssize_t>(bytes.size()), "the file takes all bytes");
  ::close(file);
  return path;
}

}  // namespace coilassay::fuzz

// A file appears whole or not at all.
#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <array>
#include <atomic>
#include <cerrno>
#include <csignal>
#include <cstdio>
#include <filesystem>
#include <system_error>

#include "acquire/capture_writer.h"

namespace coilassay {

namespace {

namespace fs = std::filesystem;

tl::unexpected<Error> cannot_write(const std::string& path, int code) {
  std::string finding, remedy;
  switch (code) {
    case ENOENT:
    case ENOTDIR:
      finding = "there is no such folder";
      remedy = "make the folder first, or give another path";
      break;
    case EACCES:
    case EPERM:
      finding = "there is no permission to write here";
      remedy = "give a path in a folder of your own";
      break;
    case EROFS:
      finding = "this file system can only be read";
      remedy = "give a path elsewhere";
      break;
    case ENOSPC:
    case EDQUOT:
      finding = "the disk is full";
      remedy = "free some space, or give a path elsewhere";
      break;
    case EFBIG:
      finding = "the file would be larger than is allowed here";
      remedy = "raise the limit (ulimit -f), or give a path elsewhere";
      break;
    case EISDIR:
      finding = "this is a folder, not a file";
      remedy = "give the name of a file in it";
      break;
    case EPIPE:
      finding = "the program reading from here has ended";
      remedy = "";
      break;
    default: finding = "it cannot be written: " + std::generic_category().message(code); remedy = "give another path";
  }
  return failure(Problem::cannot_write, path, std::move(finding), std::move(remedy));
}

/// Keeps signals that a write can raise from ending the program; the write then fails with EPIPE or EFBIG instead.
class QuietWrites {
 public:
  QuietWrites() {
    sigset_t now;
    ::sigpending(&now);
    ::sigemptyset(&ours_);
    // One that was pending already is not ours to take away.
    for (const int signal : {SIGPIPE, SIGXFSZ}) {
      if (::sigismember(&now, signal) == 0) ::sigaddset(&ours_, signal);
    }
    ::pthread_sigmask(SIG_BLOCK, &ours_, &before_);
  }
  ~QuietWrites() {
    const timespec at_once{0, 0};
    while (::sigtimedwait(&ours_, nullptr, &at_once) > 0) {
    }
    ::pthread_sigmask(SIG_SETMASK, &before_, nullptr);
  }
  QuietWrites(const QuietWrites&) = delete;
  QuietWrites& operator=(const QuietWrites&) = delete;

 private:
  sigset_t ours_{}, before_{};
};

/// 0, or the code of what went wrong.
int write_all(int file, const std::string& contents) {
  const QuietWrites quiet;
  for (std::size_t done = 0; done < contents.size();) {
    const ssize_t n = ::write(file, contents.data() + done, contents.size() - done);
    if (n < 0 && errno == EINTR) continue;
    if (n < 0) return errno;
    done += static_cast<std::size_t>(n);
  }
  return 0;
}

/// Devices, pipes and sockets have no place beside them; what is written goes straight in.
int write_into(const std::string& path, const std::string& contents) {
  const int file = ::open(path.c_str(), O_WRONLY | O_CLOEXEC | O_NOCTTY);
  if (file < 0) return errno;
  int code = write_all(file, contents);
  if (::close(file) != 0 && code == 0) code = errno;
  return code;
}

/// The file a chain of links ends at, whether it exists or not: a link is kept, its target replaced.
std::string behind_links(std::string path) {
  for (int links = 0; links < 40; ++links) {
    std::error_code error;
    const fs::path target = fs::read_symlink(path, error);
    if (error) break;
    path = target.is_absolute() ? target.string() : (fs::path(path).parent_path() / target).string();
  }
  return path;
}

/// A new file in the folder; its name is short, so that any name the target may have leaves room.
int open_beside(const fs::path& folder, mode_t mode, std::string& name) {
  static std::atomic<unsigned> counter{0};
  for (int attempt = 0; attempt < 100; ++attempt) {
    name = (folder / (".part-" + std::to_string(::getpid()) + "-" + std::to_string(counter++))).string();
    const int file = ::open(name.c_str(), O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, mode);
    if (file >= 0 || errno != EEXIST) return file;
  }
  errno = EEXIST;
  return -1;
}

int replace_file(const std::string& target, const struct stat* old, const std::string& contents) {
  if (old != nullptr && ::access(target.c_str(), W_OK) != 0) return errno;  // a file marked read-only stays
  fs::path folder = fs::path(target).parent_path();
  if (folder.empty()) folder = ".";
  std::string part;
  const int file = open_beside(folder, 0644, part);
  if (file < 0) return errno;
  int code = write_all(file, contents);
  if (code == 0 && old != nullptr && ::fchmod(file, old->st_mode & 0777) != 0) code = errno;
  if (code == 0 && ::fsync(file) != 0 && errno != EINVAL) code = errno;
  if (::close(file) != 0 && code == 0) code = errno;
  if (code == 0 && ::rename(part.c_str(), target.c_str()) != 0) code = errno;
  if (code != 0) {
    ::unlink(part.c_str());
    return code;
  }
  // The new name is safe once the folder is; a file system that cannot do this has done what it can.
  if (const int directory = ::open(folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC); directory >= 0) {
    ::fsync(directory);
    ::close(directory);
  }
  return 0;
}

}  // namespace

Result<void> write_file(const std::string& path, const std::string& contents) {
  int code = 0;
  if (path == "-") {
    std::fflush(stdout);  // what was printed before comes first
    code = write_all(STDOUT_FILENO, contents);
  } else if (path.empty()) {
    return failure(Problem::cannot_write, "", "the path is empty", "give the name of a file");
  } else {
    struct stat about {};
    const bool exists = ::stat(path.c_str(), &about) == 0;
    if (!exists && errno != ENOENT) {
      code = errno;
    } else if (path.ends_with('/') || (exists && S_ISDIR(about.st_mode))) {
      code = EISDIR;
    } else if (exists && !S_ISREG(about.st_mode)) {
      code = write_into(path, contents);
    } else {
      code = replace_file(behind_links(path), exists ? &about : nullptr, contents);
    }
  }
  if (code != 0) return cannot_write(path == "-" ? "standard output" : path, code);
  return {};
}

}  // namespace coilassay

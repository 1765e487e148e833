// Files, pipes and standard input as a stream of bytes. Read, never mapped: a mapped file that someone cuts short kills
// the process that looks at it.
#include <fcntl.h>
#include <poll.h>
#include <sys/eventfd.h>
#include <sys/stat.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <cstdint>
#include <cstring>

#include "acquire/reader.h"

namespace coilassay {
namespace {

class DescriptorBytes final : public ByteSource {
 public:
  DescriptorBytes(std::string name, int descriptor, bool owned, bool waits, std::size_t size)
      : name_(std::move(name)), descriptor_(descriptor), owned_(owned), size_(size) {
    if (!waits) return;
    wake_ = ::eventfd(0, EFD_CLOEXEC);
    // Fewer and larger turns between writer and reader; what is no pipe refuses, and goes on as it was.
    constexpr int kPipe = 1 << 20;
    ::fcntl(descriptor_, F_SETPIPE_SZ, kPipe);
  }
  ~DescriptorBytes() override {
    if (owned_) ::close(descriptor_);
    if (wake_ >= 0) ::close(wake_);
  }
  DescriptorBytes(const DescriptorBytes&) = delete;
  DescriptorBytes& operator=(const DescriptorBytes&) = delete;

  const std::string& name() const override { return name_; }
  std::size_t size_hint() const override { return size_; }

  Result<std::size_t> read(std::span<char> into) override {
    std::size_t filled = 0;
    while (filled < into.size()) {
      if (!wait_for_bytes()) break;
      const ssize_t got = ::read(descriptor_, into.data() + filled, into.size() - filled);
      if (got > 0) {
        filled += static_cast<std::size_t>(got);
      } else if (got == 0) {
        break;
      } else if (errno != EINTR) {
        return failure(Problem::unreadable, name_, std::string("cannot be read further: ") + std::strerror(errno),
                       "check the disk or the connection it comes from and try again");
      }
    }
    return filled;
  }

  void stop() override {
    if (wake_ < 0) return;
    const std::uint64_t one = 1;
    [[maybe_unused]] const ssize_t written = ::write(wake_, &one, sizeof one);
  }

 private:
  /// Of a pipe: until it has bytes or its writer is gone; false when it was told to stop.
  bool wait_for_bytes() const {
    if (wake_ < 0) return true;
    std::array<pollfd, 2> both = {pollfd{descriptor_, POLLIN, 0}, pollfd{wake_, POLLIN, 0}};
    while (::poll(both.data(), both.size(), -1) < 0 && errno == EINTR) {
    }
    return both[1].revents == 0;
  }

  std::string name_;
  int descriptor_;
  bool owned_;
  int wake_ = -1;  // written to by stop(); only where a read can wait
  std::size_t size_;
};

}  // namespace

Result<std::unique_ptr<ByteSource>> open_bytes(const std::string& path) {
  struct stat about {};
  if (path == "-") {
    const bool file = ::fstat(STDIN_FILENO, &about) == 0 && S_ISREG(about.st_mode);
    return std::make_unique<DescriptorBytes>("-", STDIN_FILENO, false, !file, file ? static_cast<std::size_t>(about.st_size) : 0);
  }
  if (path.empty()) return failure(Problem::unreadable, "(no name)", "the name of the file is empty", "name a file");
  // Without O_NONBLOCK the opening of a named pipe waits for its writer, as people expect of `cat`.
  const int descriptor = ::open(path.c_str(), O_RDONLY | O_CLOEXEC);
  if (descriptor < 0) {
    const int why = errno;
    if (why == ENOENT) {
      return failure(Problem::unreadable, path, "there is no such file", "check the name and the folder");
    }
    if (why == EACCES) {
      return failure(Problem::unreadable, path, "you have no permission to read it",
                     "ask its owner, or copy it to a place of your own");
    }
    return failure(Problem::unreadable, path, std::string("cannot be opened: ") + std::strerror(why),
                   "check the name and the folder");
  }
  if (::fstat(descriptor, &about) != 0) {
    const int why = errno;
    ::close(descriptor);
    return failure(Problem::unreadable, path, std::string("cannot be examined: ") + std::strerror(why),
                   "check the disk it is on");
  }
  if (S_ISDIR(about.st_mode)) {
    ::close(descriptor);
    return failure(Problem::unreadable, path, "is a directory, not a capture", "name the files in it");
  }
  const bool regular = S_ISREG(about.st_mode);
  return std::make_unique<DescriptorBytes>(path, descriptor, true, !regular,
                                           regular ? static_cast<std::size_t>(about.st_size) : 0);
}

}  // namespace coilassay

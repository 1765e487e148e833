// Lets libserialport take a pseudo-terminal for a serial port, in tests only: it wants an entry below /sys/class/tty and modem
// lines, and a pseudo-terminal has neither. Linked into a test program, or preloaded into the program under test.
#include <dlfcn.h>
#include <sys/ioctl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <cstdarg>
#include <cstring>

namespace {

template <class Function>
Function next(const char* name) {
  Function found = nullptr;
  void* symbol = dlsym(RTLD_NEXT, name);
  std::memcpy(&found, &symbol, sizeof found);
  return found;
}

bool is_pseudo_terminal(const char* path) {
  static constexpr char kBelow[] = "/sys/class/tty/pts/";
  return std::strncmp(path, kBelow, sizeof kBelow - 1) == 0;
}

std::array<int, 4096> modem_lines{};

}  // namespace

extern "C" {

int ioctl(int descriptor, unsigned long request, ...) noexcept {
  va_list rest;
  va_start(rest, request);
  int* value = va_arg(rest, int*);
  va_end(rest);
  static const auto real = next<int (*)(int, unsigned long, ...)>("ioctl");
  const int result = real(descriptor, request, value);
  if (result == 0 || (errno != ENOTTY && errno != EINVAL) || descriptor < 0 || descriptor >= 4096) return result;
  int& lines = modem_lines[static_cast<std::size_t>(descriptor)];
  switch (request) {
    case TIOCMGET: *value = lines | TIOCM_CTS | TIOCM_DSR | TIOCM_CD; return 0;
    case TIOCMSET: lines = *value; return 0;
    case TIOCMBIS: lines |= *value; return 0;
    case TIOCMBIC: lines &= ~*value; return 0;
    default: return result;
  }
}

ssize_t readlink(const char* path, char* into, size_t size) noexcept {
  static const auto real = next<ssize_t (*)(const char*, char*, size_t)>("readlink");
  static constexpr char kTarget[] = "../../devices/virtual/tty/pty";
  if (!is_pseudo_terminal(path) || size < sizeof kTarget) return real(path, into, size);
  std::memcpy(into, kTarget, sizeof kTarget - 1);
  return sizeof kTarget - 1;
}

// libserialport 0.1.1 of Debian 12 asks by the old name of lstat.
int __lxstat(int version, const char* path, struct stat* status) noexcept {
  static const auto real = next<int (*)(int, const char*, struct stat*)>("__lxstat");
  if (!is_pseudo_terminal(path)) return real(version, path, status);
  std::memset(status, 0, sizeof *status);
  status->st_mode = S_IFLNK | 0777;
  return 0;
}

}

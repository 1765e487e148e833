#include "app/commands/process.h"

#include <fcntl.h>
#include <sys/ioctl.h>
#include <unistd.h>

#include <csignal>
#include <cstdlib>

namespace coilassay {

namespace {

std::string_view environment(const char* name) {
  const char* value = std::getenv(name);
  return value == nullptr ? std::string_view() : std::string_view(value);
}

}  // namespace

void prepare_process() {
  std::signal(SIGPIPE, SIG_IGN);
  std::signal(SIGXFSZ, SIG_IGN);  // a file at its size limit fails like a full disk, with a sentence
  // The wrong direction on purpose: reading from or writing to it fails as it does on a closed stream.
  for (const int stream : {STDIN_FILENO, STDOUT_FILENO, STDERR_FILENO}) {
    if (fcntl(stream, F_GETFD) != -1) continue;
    if (open("/dev/null", stream == STDIN_FILENO ? O_WRONLY : O_RDONLY) != stream) std::abort();  // lowest free number
  }
}

Surroundings surroundings_of_process() {
  Surroundings around;
  around.script = script_of_locale(environment("LC_ALL"), environment("LC_CTYPE"), environment("LANG"));
  around.no_color = !environment("NO_COLOR").empty() || environment("TERM") == "dumb";
  around.out_is_terminal = isatty(STDOUT_FILENO) == 1;
  around.error_is_terminal = isatty(STDERR_FILENO) == 1;
  winsize size{};
  const int terminal = around.out_is_terminal ? STDOUT_FILENO : STDERR_FILENO;
  if (ioctl(terminal, TIOCGWINSZ, &size) == 0 && size.ws_col > 0) around.width = size.ws_col;
  return around;
}

UtcTime system_clock_now() {
  return std::chrono::time_point_cast<std::chrono::seconds>(std::chrono::system_clock::now());
}

}  // namespace coilassay

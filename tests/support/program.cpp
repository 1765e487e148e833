#include "tests/support/program.h"

#include <fcntl.h>
#include <poll.h>
#include <sys/wait.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <csignal>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <sstream>
#include <stdexcept>

#include "tests/support/paths.h"

namespace coilassay::test {

namespace {

struct Pipe {
  Pipe() {
    std::array<int, 2> ends{};
    if (pipe2(ends.data(), O_CLOEXEC) != 0) throw std::runtime_error("no pipe");
    read = ends[0];
    write = ends[1];
  }
  ~Pipe() {
    close_end(read);
    close_end(write);
  }
  Pipe(const Pipe&) = delete;
  Pipe& operator=(const Pipe&) = delete;
  static void close_end(int& end) {
    if (end >= 0) close(end);
    end = -1;
  }
  int read = -1, write = -1;
};

std::vector<char*> pointers(std::vector<std::string>& texts) {
  std::vector<char*> all;
  for (std::string& text : texts) all.push_back(text.data());
  all.push_back(nullptr);
  return all;
}

std::vector<std::string> environment_of(const ProgramStart& start) {
  std::vector<std::string> all = {"LC_ALL=C.UTF-8"};
  for (const char* name : {"PATH", "HOME", "TMPDIR", "ASAN_OPTIONS", "UBSAN_OPTIONS"}) {
    if (const char* value = std::getenv(name)) all.push_back(std::string(name) + "=" + value);
  }
  for (const std::string& each : start.environment) {
    const std::string name = each.substr(0, each.find('=') + 1);
    std::erase_if(all, [&](const std::string& other) { return other.starts_with(name); });
    all.push_back(each);
  }
  return all;
}

/// Between fork and exec only calls that are safe there.
[[noreturn]] void become(char* const* arguments, char* const* environment, const ProgramStart& start, const Pipe& in,
                         const Pipe& out, const Pipe& error, int out_file) {
  dup2(in.read, STDIN_FILENO);
  dup2(error.write, STDERR_FILENO);
  if (start.out_closed) {
    close(STDOUT_FILENO);
  } else {
    dup2(out_file >= 0 ? out_file : out.write, STDOUT_FILENO);
  }
  constexpr unsigned kNobody = 65534;
  if (start.as_nobody && geteuid() == 0 && (setgid(kNobody) != 0 || setuid(kNobody) != 0)) _exit(126);
  execve(arguments[0], arguments, environment);
  _exit(127);
}

/// Takes what is there; false when the other end is closed.
bool drain(int from, std::string& into) {
  std::array<char, 65536> block{};
  const ssize_t got = read(from, block.data(), block.size());
  if (got > 0) into.append(block.data(), static_cast<std::size_t>(got));
  return got > 0 || (got < 0 && errno == EINTR);
}

}  // namespace

ProgramEnd run_program_process(const ProgramStart& start) {
  std::vector<std::string> words = {program()};
  words.insert(words.end(), start.arguments.begin(), start.arguments.end());
  std::vector<std::string> environment = environment_of(start);
  const std::vector<char*> argument_pointers = pointers(words), environment_pointers = pointers(environment);
  const int out_file = start.out_file.empty() ? -1 : open(start.out_file.c_str(), O_WRONLY | O_CLOEXEC | O_CREAT, 0600);

  Pipe in, out, error;
  const pid_t child = fork();
  if (child < 0) throw std::runtime_error("no process");
  if (child == 0) become(argument_pointers.data(), environment_pointers.data(), start, in, out, error, out_file);
  Pipe::close_end(in.read);
  Pipe::close_end(out.write);
  Pipe::close_end(error.write);
  if (out_file >= 0) close(out_file);
  if (start.out_abandoned) Pipe::close_end(out.read);

  struct sigaction ignore {
  }, before{};
  ignore.sa_handler = SIG_IGN;
  sigaction(SIGPIPE, &ignore, &before);
  fcntl(in.write, F_SETFL, O_NONBLOCK);

  ProgramEnd end;
  const auto deadline = std::chrono::steady_clock::now() + start.patience;
  std::size_t sent = 0;
  while (out.read >= 0 || error.read >= 0) {
    if (sent == start.input.size()) Pipe::close_end(in.write);
    std::array<pollfd, 3> wait = {pollfd{out.read, POLLIN, 0}, pollfd{error.read, POLLIN, 0},
                                  pollfd{in.write, POLLOUT, 0}};
    const auto left =
        std::chrono::duration_cast<std::chrono::milliseconds>(deadline - std::chrono::steady_clock::now());
    if (left.count() <= 0 || poll(wait.data(), wait.size(), static_cast<int>(left.count())) == 0) {
      end.too_slow = true;
      kill(child, SIGKILL);
      break;
    }
    if (wait[0].revents != 0 && !drain(out.read, end.out)) Pipe::close_end(out.read);
    if (wait[1].revents != 0 && !drain(error.read, end.error)) Pipe::close_end(error.read);
    if (wait[2].revents != 0) {
      const ssize_t wrote = write(in.write, start.input.data() + sent, start.input.size() - sent);
      if (wrote > 0) sent += static_cast<std::size_t>(wrote);
      if (wrote < 0 && errno != EAGAIN && errno != EINTR) sent = start.input.size();  // it does not want more
    }
  }
  sigaction(SIGPIPE, &before, nullptr);

  int status = 0;
  while (waitpid(child, &status, 0) < 0 && errno == EINTR) {
  }
  if (WIFEXITED(status)) end.exit_code = WEXITSTATUS(status);
  if (WIFSIGNALED(status)) end.signal = WTERMSIG(status);
  return end;
}

ProgramEnd run_program_process(std::vector<std::string> arguments) {
  ProgramStart start;
  start.arguments = std::move(arguments);
  return run_program_process(start);
}

TemporaryFolder::TemporaryFolder() {
  std::string pattern = (std::filesystem::temp_directory_path() / "coilassay-test-XXXXXX").string();
  if (mkdtemp(pattern.data()) == nullptr) throw std::runtime_error("no temporary folder");
  path_ = pattern;
}

TemporaryFolder::~TemporaryFolder() {
  std::error_code ignored;
  std::filesystem::remove_all(path_, ignored);
}

std::string TemporaryFolder::file(const std::string& name, const std::string& contents) const {
  std::ofstream(path_ + "/" + name, std::ios::binary) << contents;
  return path_ + "/" + name;
}

std::string contents_of(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  std::ostringstream text;
  text << file.rdbuf();
  return text.str();
}

}  // namespace coilassay::test

#include "tests/support/background_program.h"

#include <fcntl.h>
#include <poll.h>
#include <sys/wait.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <csignal>
#include <cstdlib>
#include <stdexcept>

#include "tests/support/paths.h"

namespace coilassay::test {

BackgroundProgram::BackgroundProgram(const std::vector<std::string>& arguments, const std::vector<std::string>& environment) {
  std::array<int, 2> in{}, out{};
  if (pipe2(in.data(), O_CLOEXEC) != 0 || pipe2(out.data(), O_CLOEXEC) != 0) throw std::runtime_error("no pipe");
  std::vector<std::string> words{program()};
  words.insert(words.end(), arguments.begin(), arguments.end());
  std::vector<std::string> variables{"LC_ALL=C.UTF-8"};
  for (const char* name : {"PATH", "HOME", "TMPDIR", "ASAN_OPTIONS", "UBSAN_OPTIONS"}) {
    if (const char* value = std::getenv(name)) variables.push_back(std::string(name) + "=" + value);
  }
  variables.insert(variables.end(), environment.begin(), environment.end());
  std::vector<char*> argv, env;
  for (std::string& word : words) argv.push_back(word.data());
  for (std::string& variable : variables) env.push_back(variable.data());
  argv.push_back(nullptr);
  env.push_back(nullptr);
  const int error = open((folder_ / "error").c_str(), O_WRONLY | O_CREAT | O_CLOEXEC, 0600);
  child_ = fork();
  if (child_ == 0) {
    dup2(in[0], STDIN_FILENO);
    dup2(out[1], STDOUT_FILENO);
    dup2(error, STDERR_FILENO);
    execve(argv[0], argv.data(), env.data());
    _exit(127);
  }
  close(in[0]);
  close(out[1]);
  close(error);
  in_ = in[1];
  out_ = out[0];
  std::signal(SIGPIPE, SIG_IGN);
}

BackgroundProgram::~BackgroundProgram() {
  if (child_ > 0) {
    kill(child_, SIGKILL);
    exit_code();
  }
  if (in_ >= 0) close(in_);
  close(out_);
}

std::optional<std::string> BackgroundProgram::line(std::chrono::milliseconds patience) {
  const auto deadline = std::chrono::steady_clock::now() + patience;
  for (;;) {
    if (const std::size_t end = buffer_.find('\n'); end != std::string::npos) {
      std::string first = buffer_.substr(0, end);
      buffer_.erase(0, end + 1);
      return first;
    }
    const auto left = std::chrono::duration_cast<std::chrono::milliseconds>(deadline - std::chrono::steady_clock::now());
    pollfd wait{out_, POLLIN, 0};
    if (left.count() <= 0 || poll(&wait, 1, static_cast<int>(left.count())) <= 0) return std::nullopt;
    std::array<char, 4096> block{};
    const ssize_t got = read(out_, block.data(), block.size());
    if (got < 0 && errno == EINTR) continue;
    if (got <= 0) return std::nullopt;
    buffer_.append(block.data(), static_cast<std::size_t>(got));
  }
}

std::string BackgroundProgram::rest() {
  std::string all;
  while (auto next = line()) all += *next + "\n";
  all += buffer_;
  buffer_.clear();
  return all;
}

void BackgroundProgram::say(const std::string& text) {
  // A program that was killed does not listen; the test notices by other means.
  if (write(in_, text.data(), text.size()) < 0) return;
}

void BackgroundProgram::end_of_input() {
  if (in_ >= 0) close(in_);
  in_ = -1;
}

void BackgroundProgram::send(int signal) const {
  if (child_ > 0) kill(child_, signal);
}

int BackgroundProgram::exit_code() {
  if (child_ <= 0) return -1;
  int status = 0;
  while (waitpid(child_, &status, 0) < 0 && errno == EINTR) {
  }
  child_ = -1;
  return WIFEXITED(status) ? WEXITSTATUS(status) : -1;
}

std::string BackgroundProgram::error_text() const { return contents_of(folder_ / "error"); }

namespace {

std::vector<std::string> with_listen(const std::string& profile, std::vector<std::string> more) {
  std::vector<std::string> words{"simulate", "instrument", profile, "--listen", "localhost:0"};
  words.insert(words.end(), more.begin(), more.end());
  return words;
}

}  // namespace

SimulatedInstrument::SimulatedInstrument(const std::string& profile, std::vector<std::string> more)
    : program_(with_listen(profile, std::move(more))) {
  const std::string line = program_.line().value_or("");
  if (!line.starts_with("listening on port ")) throw std::runtime_error("it does not listen: " + line + program_.error_text());
  port_ = line.substr(18);
}

}  // namespace coilassay::test

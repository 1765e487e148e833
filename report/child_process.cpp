#include "report/child_process.h"

#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <spawn.h>
#include <stdlib.h>
#include <sys/socket.h>
#include <sys/wait.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <cstring>

namespace coilassay {

namespace {

using Clock = std::chrono::steady_clock;

/// One end of a channel to the child.
class Descriptor {
 public:
  Descriptor() = default;
  explicit Descriptor(int number) : number_(number) {}
  ~Descriptor() { close(); }
  Descriptor(const Descriptor&) = delete;
  Descriptor& operator=(const Descriptor&) = delete;

  int number() const { return number_; }
  bool open() const { return number_ >= 0; }
  void set(int number) { close(), number_ = number; }
  void close() {
    if (number_ >= 0) ::close(number_);
    number_ = -1;
  }

 private:
  int number_ = -1;
};

/// Our end and the child's end. A socket rather than a pipe: a child that stops reading then gives an error to send(),
/// not a signal that would end this process.
struct Channel {
  Descriptor ours, theirs;
  bool make() {
    std::array<int, 2> ends{};
    if (::socketpair(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC, 0, ends.data()) != 0) return false;
    ours.set(ends[0]);
    theirs.set(ends[1]);
    return ::fcntl(ends[0], F_SETFL, O_NONBLOCK) == 0;
  }
};

/// What posix_spawn needs, freed at the end.
struct SpawnPlan {
  posix_spawn_file_actions_t actions;
  posix_spawnattr_t attributes;
  SpawnPlan() {
    ::posix_spawn_file_actions_init(&actions);
    ::posix_spawnattr_init(&attributes);
  }
  ~SpawnPlan() {
    ::posix_spawn_file_actions_destroy(&actions);
    ::posix_spawnattr_destroy(&attributes);
  }
  SpawnPlan(const SpawnPlan&) = delete;
  SpawnPlan& operator=(const SpawnPlan&) = delete;
};

std::vector<char*> pointers(std::vector<std::string>& texts) {
  std::vector<char*> result;
  for (std::string& text : texts) result.push_back(text.data());
  result.push_back(nullptr);
  return result;
}

/// Sends what the child will take now; closes the channel when all is sent or nobody reads.
void feed(Descriptor& to, std::string_view& rest) {
  while (to.open() && !rest.empty()) {
    const ssize_t sent = ::send(to.number(), rest.data(), rest.size(), MSG_NOSIGNAL);
    if (sent < 0 && errno == EINTR) continue;
    if (sent < 0 && errno == EAGAIN) return;
    if (sent < 0) break;
    rest.remove_prefix(static_cast<std::size_t>(sent));
  }
  to.close();
}

/// Takes what is there; closes the channel at its end. What goes beyond the limit is counted, not kept.
void drain(Descriptor& from, std::string& text, std::size_t limit, bool& too_much) {
  std::array<char, 65536> block;
  while (from.open()) {
    const ssize_t got = ::recv(from.number(), block.data(), block.size(), 0);
    if (got < 0 && errno == EINTR) continue;
    if (got < 0 && errno == EAGAIN) return;
    if (got <= 0) {
      from.close();
      return;
    }
    const std::size_t room = limit - text.size();
    const auto count = static_cast<std::size_t>(got);
    too_much = too_much || count > room;
    text.append(block.data(), std::min(count, room));
  }
}

/// Whether the child has ended, without taking it off the process table: until then its number, and that of its process
/// group, cannot belong to anybody else.
bool has_ended(pid_t child) {
  siginfo_t info{};
  return ::waitid(P_PID, static_cast<id_t>(child), &info, WEXITED | WNOHANG | WNOWAIT) == 0 && info.si_pid == child;
}

/// Ends the child's process group (children of its own too) and gives its exit code.
int collect(pid_t child) {
  ::kill(-child, SIGKILL);
  int status = 0;
  while (::waitpid(child, &status, 0) < 0 && errno == EINTR) {
  }
  return WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
}

tl::unexpected<Error> child_failure(const ChildRequest& request, std::string finding) {
  return failure(Problem::missing_helper, std::filesystem::path(request.program).filename().string(),
                 std::move(finding), "the numbers do not need it; run the command again without a figure or page");
}

}  // namespace

Result<ScratchFolder> ScratchFolder::make() {
  std::error_code trouble;
  std::filesystem::path where = std::filesystem::temp_directory_path(trouble);
  if (trouble) where = "/tmp";
  std::string pattern = (where / "coilassay-XXXXXX").string();
  if (::mkdtemp(pattern.data()) == nullptr) {
    return failure(Problem::cannot_write, where.string(),
                   std::string("no temporary folder can be made here: ") + std::strerror(errno),
                   "set TMPDIR to a folder that can be written to");
  }
  return ScratchFolder(pattern);
}

ScratchFolder::ScratchFolder(ScratchFolder&& other) noexcept : path_(std::move(other.path_)) {
  other.path_.clear();
}

ScratchFolder::~ScratchFolder() {
  if (path_.empty()) return;
  std::error_code ignored;  // a folder that cannot be removed is no reason to lose a result
  std::filesystem::remove_all(path_, ignored);
}

std::optional<std::string> find_program(std::string_view name) {
  const char* path = ::getenv("PATH");
  std::string_view rest = path != nullptr ? path : "";
  while (!rest.empty()) {
    const std::string_view folder = rest.substr(0, rest.find(':'));
    rest.remove_prefix(std::min(rest.size(), folder.size() + 1));
    if (folder.empty() || folder.front() != '/') continue;
    std::string candidate = std::string(folder) + '/' + std::string(name);
    std::error_code trouble;
    if (std::filesystem::is_regular_file(candidate, trouble) && ::access(candidate.c_str(), X_OK) == 0)
      return candidate;
  }
  return std::nullopt;
}

Result<ChildOutcome> run_child(const ChildRequest& request) {
  Channel input, output, messages;
  if (!input.make() || !output.make() || !messages.make()) {
    return child_failure(request, std::string("cannot be started: ") + std::strerror(errno));
  }

  SpawnPlan plan;
  ::posix_spawn_file_actions_adddup2(&plan.actions, input.theirs.number(), STDIN_FILENO);
  ::posix_spawn_file_actions_adddup2(&plan.actions, output.theirs.number(), STDOUT_FILENO);
  ::posix_spawn_file_actions_adddup2(&plan.actions, messages.theirs.number(), STDERR_FILENO);
  ::posix_spawn_file_actions_addclosefrom_np(&plan.actions, STDERR_FILENO + 1);
  ::posix_spawn_file_actions_addchdir_np(&plan.actions, request.folder.c_str());
  ::posix_spawnattr_setflags(&plan.attributes, POSIX_SPAWN_SETPGROUP | POSIX_SPAWN_SETSIGDEF | POSIX_SPAWN_SETSIGMASK);
  ::posix_spawnattr_setpgroup(&plan.attributes, 0);
  sigset_t signals;
  ::sigfillset(&signals);
  ::posix_spawnattr_setsigdefault(&plan.attributes, &signals);
  ::sigemptyset(&signals);
  ::posix_spawnattr_setsigmask(&plan.attributes, &signals);

  std::vector<std::string> arguments = request.arguments;
  arguments.insert(arguments.begin(), request.program);
  const char* path = ::getenv("PATH");
  std::vector<std::string> environment = {"LC_ALL=C", std::string("PATH=") + (path != nullptr ? path : "/usr/bin:/bin"),
                                          "HOME=" + request.folder.string(), "TMPDIR=" + request.folder.string()};
  pid_t child = 0;
  const int trouble = ::posix_spawn(&child, request.program.c_str(), &plan.actions, &plan.attributes,
                                    pointers(arguments).data(), pointers(environment).data());
  if (trouble != 0) return child_failure(request, std::string("cannot be started: ") + std::strerror(trouble));
  input.theirs.close();
  output.theirs.close();
  messages.theirs.close();

  ChildOutcome outcome;
  std::string_view rest = request.input;
  bool too_much = false;
  bool ignored = false;
  const Clock::time_point deadline = Clock::now() + request.time_limit;
  const auto exchange = [&] {
    feed(input.ours, rest);
    drain(output.ours, outcome.output, request.output_limit, too_much);
    drain(messages.ours, outcome.messages, 64u << 10, ignored);
  };
  bool ended = false;
  while (!(ended = has_ended(child)) && Clock::now() < deadline && !too_much) {
    exchange();
    // Closed channels have number -1, which poll() passes over. What the child started may hold its output open after
    // its end, so the wait is short and the end is asked for, not inferred.
    std::array<pollfd, 3> waits = {pollfd{input.ours.number(), POLLOUT, 0}, pollfd{output.ours.number(), POLLIN, 0},
                                   pollfd{messages.ours.number(), POLLIN, 0}};
    ::poll(waits.data(), waits.size(), output.ours.open() ? 20 : 2);
  }
  outcome.exit_code = collect(child);
  if (too_much) return child_failure(request, "wrote more than can be right and was stopped");
  if (!ended) {
    return child_failure(
        request, "did not end within " + std::to_string(request.time_limit.count() / 1000) + " s and was stopped");
  }
  exchange();
  return outcome;
}

}  // namespace coilassay

// A part of a test that runs in a process of its own: with other rights, under limits, or to be killed.
#pragma once

#include <sys/wait.h>
#include <unistd.h>

#include <csignal>
#include <string>

namespace coilassay::test {

/// What the work says, run in a child; "" when it ended badly. `as_nobody`: started by root, without root's rights.
template <class Work>
std::string in_child(const Work& work, bool as_nobody = false) {
  int ends[2];
  if (::pipe(ends) != 0) return {};
  const pid_t child = ::fork();
  if (child == 0) {
    constexpr unsigned kNobody = 65534;
    if (as_nobody && ::geteuid() == 0 && (::setgid(kNobody) != 0 || ::setuid(kNobody) != 0)) ::_exit(1);
    const std::string said = work();
    const bool all = ::write(ends[1], said.data(), said.size()) == static_cast<ssize_t>(said.size());
    ::_exit(all ? 0 : 1);
  }
  ::close(ends[1]);
  std::string said;
  char block[4096];
  for (ssize_t n; (n = ::read(ends[0], block, sizeof block)) > 0;) said.append(block, static_cast<std::size_t>(n));
  ::close(ends[0]);
  int status = 0;
  ::waitpid(child, &status, 0);
  return WIFEXITED(status) && WEXITSTATUS(status) == 0 ? said : std::string();
}

}  // namespace coilassay::test

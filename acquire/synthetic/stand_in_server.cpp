#include "acquire/synthetic/stand_in_server.h"

#include <arpa/inet.h>
#include <fcntl.h>
#include <netdb.h>
#include <netinet/in.h>
#include <netinet/tcp.h>
#include <poll.h>
#include <sys/socket.h>
#include <unistd.h>

#include <algorithm>
#include <array>
#include <cerrno>
#include <chrono>
#include <utility>
#include <vector>

#include "acquire/instrument/byte_stream.h"
#include "acquire/instrument/descriptor_stream.h"
#include "base/outside_text.h"

namespace coilassay::synthetic {

namespace {

using Clock = std::chrono::steady_clock;

Span span_of(double seconds) { return std::chrono::duration_cast<Span>(std::chrono::duration<double>(seconds)); }

struct Due {
  SteadyTime at;
  TimedBytes what;
};

/// false: the line is gone.
bool write_all(int descriptor, std::string_view bytes, const std::function<bool()>& stop) {
  while (!bytes.empty()) {
    ssize_t sent = send(descriptor, bytes.data(), bytes.size(), MSG_NOSIGNAL);
    if (sent < 0 && errno == ENOTSOCK) sent = write(descriptor, bytes.data(), bytes.size());
    if (sent > 0) {
      bytes.remove_prefix(static_cast<std::size_t>(sent));
    } else if (errno == EAGAIN) {
      pollfd wait{descriptor, POLLOUT, 0};
      poll(&wait, 1, 50);
      if (stop()) return false;
    } else if (errno != EINTR) {
      return false;
    }
  }
  return true;
}

bool is_loopback(const sockaddr& address) {
  if (address.sa_family == AF_INET) {
    sockaddr_in v4{};
    std::copy_n(reinterpret_cast<const char*>(&address), sizeof v4, reinterpret_cast<char*>(&v4));
    return ntohl(v4.sin_addr.s_addr) >> 24 == 127;
  }
  if (address.sa_family == AF_INET6) {
    sockaddr_in6 v6{};
    std::copy_n(reinterpret_cast<const char*>(&address), sizeof v6, reinterpret_cast<char*>(&v6));
    return IN6_IS_ADDR_LOOPBACK(&v6.sin6_addr);
  }
  return false;
}

unsigned short port_of(int descriptor) {
  sockaddr_storage bound{};
  socklen_t size = sizeof bound;
  if (getsockname(descriptor, reinterpret_cast<sockaddr*>(&bound), &size) != 0) return 0;
  return ntohs(bound.ss_family == AF_INET6 ? reinterpret_cast<sockaddr_in6*>(&bound)->sin6_port : reinterpret_cast<sockaddr_in*>(&bound)->sin_port);
}

}  // namespace

void serve_descriptor(int descriptor, StandIn& stand_in, double line_every_s, const std::function<bool()>& stop) {
  fcntl(descriptor, F_SETFL, fcntl(descriptor, F_GETFL) | O_NONBLOCK);
  std::vector<Due> due;
  SteadyTime next_line = Clock::now() + span_of(line_every_s);
  std::array<char, 4096> block{};
  while (!stop()) {
    SteadyTime now = Clock::now();
    if (stand_in.prints_unasked() && now >= next_line) {
      due.push_back({now, {0, stand_in.unasked_line()}});
      next_line += span_of(line_every_s);
    }
    std::stable_sort(due.begin(), due.end(), [](const Due& a, const Due& b) { return a.at < b.at; });
    while (!due.empty() && due.front().at <= now) {
      const Due first = std::move(due.front());
      due.erase(due.begin());
      if (!write_all(descriptor, first.what.bytes, stop) || first.what.drop_after) return;
    }
    SteadyTime until = now + kSlice;
    if (!due.empty()) until = std::min(until, due.front().at);
    if (stand_in.prints_unasked()) until = std::min(until, next_line);
    static_assert(Span::period::den == 1'000'000'000);
    timespec left{};
    const auto nanoseconds = std::max<long long>(0, (until - now).count());
    left.tv_nsec = static_cast<long>(std::min<long long>(nanoseconds, 999'999'999));
    pollfd wait{descriptor, POLLIN, 0};
    if (ppoll(&wait, 1, &left, nullptr) <= 0) continue;
    const ssize_t got = read(descriptor, block.data(), block.size());
    if (got == 0 || (got < 0 && errno != EAGAIN && errno != EINTR)) return;
    if (got < 0) continue;
    now = Clock::now();
    for (TimedBytes& each : stand_in.receive({block.data(), static_cast<std::size_t>(got)})) {
      due.push_back({now + span_of(each.after_s), std::move(each)});
    }
  }
}

StandInServer::StandInServer(StandInServer&& other) noexcept
    : descriptor_(std::exchange(other.descriptor_, -1)), port_(other.port_) {}

StandInServer::~StandInServer() {
  if (descriptor_ >= 0) close(descriptor_);
}

Result<StandInServer> StandInServer::listen(const std::string& address) {
  const auto both = parse_host_and_port(address, "--listen");
  if (!both) return failure(both);
  addrinfo hints{};
  hints.ai_family = AF_UNSPEC;
  hints.ai_socktype = SOCK_STREAM;
  addrinfo* found = nullptr;
  const int trouble = getaddrinfo(both->host.c_str(), std::to_string(both->port).c_str(), &hints, &found);
  int descriptor = -1, error = 0;
  bool loopback = false;
  for (const addrinfo* each = found; trouble == 0 && each != nullptr && descriptor < 0; each = each->ai_next) {
    if (!is_loopback(*each->ai_addr)) continue;
    loopback = true;
    descriptor = socket(each->ai_family, each->ai_socktype | SOCK_CLOEXEC | SOCK_NONBLOCK, each->ai_protocol);
    const int on = 1;
    if (descriptor >= 0) setsockopt(descriptor, SOL_SOCKET, SO_REUSEADDR, &on, sizeof on);
    if (descriptor >= 0 && (bind(descriptor, each->ai_addr, each->ai_addrlen) != 0 || ::listen(descriptor, 4) != 0)) {
      error = errno;
      close(descriptor);
      descriptor = -1;
    }
  }
  if (trouble == 0) freeaddrinfo(found);
  if (!loopback) {
    return failure(Problem::usage, "--listen", "'" + shown(both->host, 60) + "' is not this machine's loopback", "write localhost:" + std::to_string(both->port) + "; the stand-in is for this machine only");
  }
  if (descriptor < 0) {
    return failure(Problem::instrument, address, error == EADDRINUSE ? "the port is taken" : "the port cannot be had", "take another port; 0 lets the system choose");
  }
  return StandInServer(descriptor, port_of(descriptor));
}

void StandInServer::run(StandIn& stand_in, double line_every_s, const std::function<bool()>& stop) const {
  while (!stop()) {
    pollfd wait{descriptor_, POLLIN, 0};
    if (poll(&wait, 1, 50) <= 0) continue;
    const int caller = accept4(descriptor_, nullptr, nullptr, SOCK_CLOEXEC | SOCK_NONBLOCK);
    if (caller < 0) continue;
    const int on = 1;
    setsockopt(caller, IPPROTO_TCP, TCP_NODELAY, &on, sizeof on);
    serve_descriptor(caller, stand_in, line_every_s, stop);
    close(caller);
    stand_in.line_was_dropped();
  }
}

}  // namespace coilassay::synthetic

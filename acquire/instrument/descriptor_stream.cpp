#include "acquire/instrument/descriptor_stream.h"

#include <fcntl.h>
#include <netdb.h>
#include <netinet/in.h>
#include <netinet/tcp.h>
#include <poll.h>
#include <sys/socket.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <charconv>
#include <system_error>

#include "base/outside_text.h"

namespace coilassay {

namespace {

int milliseconds_until(SteadyTime deadline) {
  const auto left = std::chrono::ceil<std::chrono::milliseconds>(deadline - std::chrono::steady_clock::now());
  return static_cast<int>(std::clamp<long long>(left.count(), 0, 60'000));
}

std::string words_of(int error) { return std::generic_category().message(error); }

class DescriptorStream final : public ByteStream {
 public:
  DescriptorStream(int descriptor, std::string name) : descriptor_(descriptor), name_(std::move(name)) {
    fcntl(descriptor_, F_SETFL, fcntl(descriptor_, F_GETFL) | O_NONBLOCK);
  }
  ~DescriptorStream() override { close(descriptor_); }
  DescriptorStream(const DescriptorStream&) = delete;
  DescriptorStream& operator=(const DescriptorStream&) = delete;

  const std::string& name() const override { return name_; }

  Result<void> write(std::string_view bytes, Span patience) override {
    const SteadyTime deadline = std::chrono::steady_clock::now() + patience;
    while (!bytes.empty()) {
      const ssize_t sent = socket_write(bytes);
      if (sent > 0) {
        bytes.remove_prefix(static_cast<std::size_t>(sent));
        continue;
      }
      if (sent < 0 && errno == EINTR) continue;
      if (sent < 0 && errno != EAGAIN) return lost("the line was lost while sending: " + words_of(errno));
      pollfd wait{descriptor_, POLLOUT, 0};
      const int left = milliseconds_until(deadline);
      if (left == 0 || poll(&wait, 1, left) == 0) return lost("it does not take what is sent");
    }
    return {};
  }

  Result<std::size_t> read(std::span<char> into, Span patience) override {
    const SteadyTime deadline = std::chrono::steady_clock::now() + patience;
    for (;;) {
      const ssize_t got = ::read(descriptor_, into.data(), into.size());
      if (got > 0) return static_cast<std::size_t>(got);
      if (got == 0) return lost("the other end closed the line");
      if (errno == EINTR) continue;
      if (errno != EAGAIN) return lost("the line was lost: " + words_of(errno));
      const int left = milliseconds_until(deadline);
      if (left == 0) return 0;
      pollfd wait{descriptor_, POLLIN, 0};
      if (poll(&wait, 1, left) == 0) return 0;
    }
  }

 private:
  ssize_t socket_write(std::string_view bytes) {
    const ssize_t sent = send(descriptor_, bytes.data(), bytes.size(), MSG_NOSIGNAL);
    if (sent >= 0 || errno != ENOTSOCK) return sent;
    return ::write(descriptor_, bytes.data(), bytes.size());
  }
  tl::unexpected<Error> lost(std::string finding) const {
    return failure(Problem::instrument, name_, std::move(finding), "look at the cable and whether the instrument is on");
  }

  int descriptor_;
  std::string name_;
};

/// One address of a name; -1 when it does not connect in time, errno says why.
int connected(const addrinfo& address, SteadyTime deadline) {
  const int descriptor = socket(address.ai_family, address.ai_socktype | SOCK_CLOEXEC | SOCK_NONBLOCK, address.ai_protocol);
  if (descriptor < 0) return -1;
  int error = 0;
  if (connect(descriptor, address.ai_addr, address.ai_addrlen) != 0) error = errno;
  if (error == EINPROGRESS) {
    pollfd wait{descriptor, POLLOUT, 0};
    socklen_t size = sizeof error;
    if (poll(&wait, 1, milliseconds_until(deadline)) <= 0) error = ETIMEDOUT;
    else if (getsockopt(descriptor, SOL_SOCKET, SO_ERROR, &error, &size) != 0) error = errno;
  }
  if (error != 0) {
    close(descriptor);
    errno = error;
    return -1;
  }
  // Questions are short and must not wait for more; a peer that vanished without a word is to be noticed.
  const int on = 1;
  setsockopt(descriptor, IPPROTO_TCP, TCP_NODELAY, &on, sizeof on);
  setsockopt(descriptor, SOL_SOCKET, SO_KEEPALIVE, &on, sizeof on);
  return descriptor;
}

}  // namespace

std::unique_ptr<ByteStream> stream_over_descriptor(int descriptor, std::string name) {
  return std::make_unique<DescriptorStream>(descriptor, std::move(name));
}

Result<HostAndPort> parse_host_and_port(const std::string& address, const std::string& place) {
  const std::size_t colon = address.rfind(':');
  HostAndPort both;
  unsigned port = 0;
  bool fine = colon != std::string::npos && colon > 0 && colon + 1 < address.size();
  if (fine) {
    const char* end = address.data() + address.size();
    const auto [stop, trouble] = std::from_chars(address.data() + colon + 1, end, port);
    fine = trouble == std::errc() && stop == end && port <= 65535;
    both.host = address.substr(0, colon);
    if (both.host.starts_with('[') && both.host.ends_with(']')) both.host = both.host.substr(1, both.host.size() - 2);
    fine = fine && !both.host.empty();
  }
  if (!fine) {
    return failure(Problem::usage, place, "'" + shown(address, 60) + "' is no host and port", "write it like localhost:5025");
  }
  both.port = static_cast<unsigned short>(port);
  return both;
}

Result<std::unique_ptr<ByteStream>> open_tcp(const std::string& address, Span patience) {
  const auto both = parse_host_and_port(address, "port");
  if (!both) return failure(both);
  addrinfo hints{};
  hints.ai_family = AF_UNSPEC;
  hints.ai_socktype = SOCK_STREAM;
  addrinfo* found = nullptr;
  if (const int trouble = getaddrinfo(both->host.c_str(), std::to_string(both->port).c_str(), &hints, &found); trouble != 0) {
    return failure(Problem::instrument, address, std::string("the host is not known: ") + gai_strerror(trouble),
                   "look at its name or address in the profile");
  }
  const SteadyTime deadline = std::chrono::steady_clock::now() + patience;
  int descriptor = -1, error = 0;
  for (const addrinfo* each = found; each != nullptr && descriptor < 0; each = each->ai_next) {
    descriptor = connected(*each, deadline);
    if (descriptor < 0) error = errno;
  }
  freeaddrinfo(found);
  if (descriptor < 0) {
    const std::string finding = error == ECONNREFUSED ? "nobody listens there"
                                : error == ETIMEDOUT  ? "it does not answer"
                                                      : "no connection: " + words_of(error);
    return failure(Problem::instrument, address, finding, "switch the instrument on, and look at address and port in the profile");
  }
  return stream_over_descriptor(descriptor, address);
}

}  // namespace coilassay

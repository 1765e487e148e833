// A byte stream over a file descriptor: a socket, a pipe pair's end, a terminal that is already set up.
#pragma once

#include <memory>
#include <string>

#include "acquire/instrument/byte_stream.h"

namespace coilassay {

/// Takes the descriptor over and closes it in the end.
std::unique_ptr<ByteStream> stream_over_descriptor(int descriptor, std::string name);

/// Connects to "host:port" (also "[::1]:5025") within `patience`. instrument: an address that cannot be understood, a name that
/// is not known, nobody listens there, no answer in time.
Result<std::unique_ptr<ByteStream>> open_tcp(const std::string& address, Span patience);

/// "localhost:5025" taken apart; usage when it is no host and port. Port 0 is allowed: whoever listens chooses.
struct HostAndPort {
  std::string host;
  unsigned short port = 0;
};
Result<HostAndPort> parse_host_and_port(const std::string& address, const std::string& place);

}  // namespace coilassay

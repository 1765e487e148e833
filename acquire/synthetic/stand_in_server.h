// Puts a stand-in instrument on a line: a TCP port of this machine, or a descriptor that is open already (a pseudo-terminal).
#pragma once

#include <functional>
#include <string>

#include "acquire/synthetic/stand_in.h"
#include "base/result.h"

namespace coilassay::synthetic {

/// Listens on a loopback address; nobody else's machine can talk to it.
class StandInServer {
 public:
  /// usage: no host and port, or a host that is not this machine's loopback; instrument: the port is taken.
  static Result<StandInServer> listen(const std::string& address);
  ~StandInServer();
  StandInServer(StandInServer&& other) noexcept;
  StandInServer& operator=(StandInServer&&) = delete;

  unsigned short port() const { return port_; }
  /// Serves one caller after the other until `stop` says so; it is asked at least every 50 ms.
  void run(StandIn& stand_in, double line_every_s, const std::function<bool()>& stop) const;

 private:
  explicit StandInServer(int descriptor, unsigned short port) : descriptor_(descriptor), port_(port) {}
  int descriptor_ = -1;
  unsigned short port_ = 0;
};

/// Serves an open line until the other end closes it, the stand-in drops it, or `stop` says so. The descriptor stays the
/// caller's. `line_every_s`: pace of one that prints unasked.
void serve_descriptor(int descriptor, StandIn& stand_in, double line_every_s, const std::function<bool()>& stop);

}  // namespace coilassay::synthetic

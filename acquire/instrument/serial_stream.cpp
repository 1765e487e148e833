#include "acquire/instrument/serial_stream.h"

#include <libserialport.h>
#include <sys/file.h>

#include <algorithm>
#include <cerrno>
#include <cstdlib>
#include <cstring>

#include "base/outside_text.h"

namespace coilassay {

namespace {

struct FreePort {
  void operator()(sp_port* port) const {
    sp_close(port);
    sp_free_port(port);
  }
};
using Port = std::unique_ptr<sp_port, FreePort>;

unsigned milliseconds(Span span) {
  const auto whole = std::chrono::ceil<std::chrono::milliseconds>(span).count();
  return static_cast<unsigned>(std::clamp<long long>(whole, 0, 60'000));
}

class SerialStream final : public ByteStream {
 public:
  SerialStream(Port port, std::string name) : port_(std::move(port)), name_(std::move(name)) {}

  const std::string& name() const override { return name_; }

  Result<void> write(std::string_view bytes, Span patience) override {
    // 0 would mean to wait for ever.
    const unsigned wait = std::max(1u, milliseconds(patience));
    const int sent = sp_blocking_write(port_.get(), bytes.data(), bytes.size(), wait);
    if (sent < 0) return lost("the line was lost while sending");
    if (static_cast<std::size_t>(sent) != bytes.size()) return lost("it does not take what is sent");
    return {};
  }

  Result<std::size_t> read(std::span<char> into, Span patience) override {
    const SteadyTime deadline = std::chrono::steady_clock::now() + patience;
    for (;;) {
      const Span left = deadline - std::chrono::steady_clock::now();
      // In slices: a port that is gone lets a read wait and then says nothing came; only asking for what waits tells.
      const int got = left <= Span::zero()
                          ? sp_nonblocking_read(port_.get(), into.data(), into.size())
                          : sp_blocking_read_next(port_.get(), into.data(), into.size(),
                                                  std::max(1u, std::min(milliseconds(left), milliseconds(kSlice))));
      if (got > 0) return static_cast<std::size_t>(got);
      if (got < 0 || sp_input_waiting(port_.get()) < 0) return lost("the port is gone: the lead was pulled or the instrument switched off");
      if (std::chrono::steady_clock::now() >= deadline) return 0;
    }
  }

 private:
  tl::unexpected<Error> lost(std::string finding) const {
    return failure(Problem::instrument, name_, std::move(finding), "put the lead back in");
  }

  Port port_;
  std::string name_;
};

sp_parity parity_of(char letter) {
  switch (letter) {
    case 'E': return SP_PARITY_EVEN;
    case 'O': return SP_PARITY_ODD;
    case 'M': return SP_PARITY_MARK;
    case 'S': return SP_PARITY_SPACE;
    default: return SP_PARITY_NONE;
  }
}

sp_flowcontrol flow_of(SerialSetup::Flow flow) {
  switch (flow) {
    case SerialSetup::Flow::hardware: return SP_FLOWCONTROL_RTSCTS;
    case SerialSetup::Flow::software: return SP_FLOWCONTROL_XONXOFF;
    case SerialSetup::Flow::none: break;
  }
  return SP_FLOWCONTROL_NONE;
}

/// The port by its name; libserialport knows devices only, so a link is followed.
sp_port* find_port(const std::string& name) {
  sp_port* port = nullptr;
  if (sp_get_port_by_name(name.c_str(), &port) == SP_OK) return port;
  char* real = realpath(name.c_str(), nullptr);
  if (real == nullptr) return nullptr;
  const bool found = sp_get_port_by_name(real, &port) == SP_OK;
  std::free(real);
  return found ? port : nullptr;
}

}  // namespace

Result<std::unique_ptr<ByteStream>> open_serial(const std::string& name, const SerialSetup& setup) {
  const auto trouble = [&](std::string finding, std::string remedy) {
    return failure(Problem::instrument, name, std::move(finding), std::move(remedy));
  };
  sp_port* found = find_port(name);
  if (found == nullptr) {
    return trouble("there is no such serial port", "plug the lead in; names that stay are in /dev/serial/by-id");
  }
  // Closing a port that was never opened does nothing.
  Port port(found);
  errno = 0;
  if (sp_open(found, SP_MODE_READ_WRITE) != SP_OK) {
    const int error = sp_last_error_code();
    if (error == EBUSY) return trouble("another program has this port open", "close that program");
    if (error == EACCES) return trouble("there is no permission to use this port", "join the group that owns it (often 'dialout')");
    return trouble("the port cannot be opened: " + std::string(std::strerror(error)), "look at the lead");
  }
  int descriptor = -1;
  sp_get_port_handle(found, &descriptor);
  // The kernel's own exclusion does not bind a privileged user; this one binds every copy of this program.
  if (flock(descriptor, LOCK_EX | LOCK_NB) != 0 && errno == EWOULDBLOCK) {
    return trouble("another program has this port open", "close that program");
  }
  const bool set = sp_set_baudrate(found, setup.baud) == SP_OK && sp_set_bits(found, setup.bits) == SP_OK &&
                   sp_set_parity(found, parity_of(setup.parity)) == SP_OK &&
                   sp_set_stopbits(found, setup.stop_bits) == SP_OK &&
                   sp_set_flowcontrol(found, flow_of(setup.flow)) == SP_OK;
  if (!set) return trouble("the port cannot do this baud, frame or flow control", "set what the instrument's manual says");
  return std::make_unique<SerialStream>(std::move(port), name);
}

}  // namespace coilassay

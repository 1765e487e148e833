// A serial port, by libserialport.
#pragma once

#include <memory>
#include <string>

#include "acquire/instrument/byte_stream.h"

namespace coilassay {

struct SerialSetup {
  int baud = 9600;
  int bits = 8;
  char parity = 'N';  // N none, E even, O odd, M mark, S space
  int stop_bits = 1;
  enum class Flow { none, hardware, software } flow = Flow::none;
};

/// Opens a port for this program alone. The name may be a link (/dev/serial/by-id/...). instrument: no such port, no
/// permission, taken by another program, settings it cannot do.
Result<std::unique_ptr<ByteStream>> open_serial(const std::string& port, const SerialSetup& setup);

}  // namespace coilassay

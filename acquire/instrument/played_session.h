// A recorded session played back: the log of an earlier one stands in for the instrument.
#pragma once

#include <memory>
#include <string>

#include "acquire/instrument/byte_stream.h"

namespace coilassay {

/// Plays a log made with --trace. What came then comes again, as long after the bytes before it were sent as it did then;
/// what is sent must be what was sent then, otherwise the line is lost and the error says what differs; so it is when more
/// is sent than was then. unreadable: no such log; damaged: a line that no log has.
Result<std::unique_ptr<ByteStream>> open_played_session(const std::string& path);

}  // namespace coilassay

// From a profile's [link] to a stream.
#pragma once

#include <memory>

#include "acquire/instrument/byte_log.h"
#include "acquire/instrument/byte_stream.h"
#include "acquire/instrument/profile.h"

namespace coilassay {

/// Opens what the link names, and writes everything into the log when there is one. A recorded session opens once only.
StreamOpener opener_of(const LinkSetup& link, std::shared_ptr<ByteLog> log = nullptr);

}  // namespace coilassay

// Touchstone files: port parameters against frequency.
#pragma once

#include <memory>

#include "acquire/reader.h"

namespace coilassay {

/// .s1p to .s99p and .ts, versions 1.0, 1.1, 2.0, 2.1 of the open IBIS file specification.
std::unique_ptr<Reader> touchstone_reader();

}  // namespace coilassay

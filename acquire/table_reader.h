// Tables of samples in text: one row a sample, one column a channel.
#pragma once

#include <memory>

#include "acquire/reader.h"

namespace coilassay {

std::unique_ptr<Reader> table_reader();

}  // namespace coilassay

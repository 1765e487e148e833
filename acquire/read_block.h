// How many bytes are read at once.
#pragma once

#include <cstddef>

// Small under the preset `fuzz`, so that short inputs have seams between blocks.
#ifndef COILASSAY_READ_BLOCK
#define COILASSAY_READ_BLOCK (std::size_t{1} << 20U)
#endif

namespace coilassay {

inline constexpr std::size_t kReadBlock = COILASSAY_READ_BLOCK;

}  // namespace coilassay

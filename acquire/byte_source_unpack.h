// Compressed files, unpacked as they are read.
#pragma once

#include <memory>
#include <string_view>

#include "acquire/reader.h"

namespace coilassay {

/// How much a compressed file may unfold to. A small file that unfolds without end would fill the memory.
struct UnpackLimits {
  std::size_t most_bytes = std::size_t{32} << 30U;
  std::size_t most_ratio = 1000;                   // unpacked to packed, judged beyond free_bytes; text reaches 200 at most
  std::size_t free_bytes = std::size_t{64} << 20U;
};

/// gzip (RFC 1952, by zlib) and Zstandard (RFC 8878, by libzstd), told by their first bytes; null for anything else.
/// The stream gives damaged when the data are cut short or wrong, and when they go beyond the limits.
/// @param inner  not owned, must live as long
std::unique_ptr<ByteSource> unpacked(ByteSource& inner, std::string_view first_bytes, const UnpackLimits& limits = {});

}  // namespace coilassay

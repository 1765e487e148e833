// Definite-length blocks of IEEE 488.2 (8.7.9, from memory): #, one digit that counts the digits that follow, the number of bytes
// in those digits, the bytes.
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/instrument/profile.h"

namespace coilassay {

struct BlockHeader {
  std::size_t header_bytes = 0;   // of "#" and the digits
  std::size_t payload_bytes = 0;
};

enum class HeaderState { complete, needs_more, no_block };

/// Looks at the first bytes of a block. "#0" (a block without a stated length) is no definite-length block.
HeaderState read_block_header(std::string_view bytes, BlockHeader& header);

/// Bytes of one sample; 0 for rows.
std::size_t bytes_per_sample(RecordSetup::Format format);

/// Raw numbers of the samples in a payload whose size is a multiple of bytes_per_sample(): two's complement or IEEE 754.
std::vector<double> raw_samples(std::string_view payload, RecordSetup::Format format, bool big_endian);

}  // namespace coilassay

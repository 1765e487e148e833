#include "acquire/instrument/block.h"

#include <bit>
#include <cassert>
#include <cstdint>

namespace coilassay {

HeaderState read_block_header(std::string_view bytes, BlockHeader& header) {
  if (bytes.empty()) return HeaderState::needs_more;
  if (bytes[0] != '#') return HeaderState::no_block;
  if (bytes.size() < 2) return HeaderState::needs_more;
  if (bytes[1] < '1' || bytes[1] > '9') return HeaderState::no_block;
  const auto digits = static_cast<std::size_t>(bytes[1] - '0');
  std::size_t length = 0;
  for (std::size_t i = 0; i < digits; ++i) {
    if (2 + i >= bytes.size()) return HeaderState::needs_more;
    const char c = bytes[2 + i];
    if (c < '0' || c > '9') return HeaderState::no_block;
    length = length * 10 + static_cast<std::size_t>(c - '0');
  }
  header = {2 + digits, length};
  return HeaderState::complete;
}

std::size_t bytes_per_sample(RecordSetup::Format format) {
  switch (format) {
    case RecordSetup::Format::int8: return 1;
    case RecordSetup::Format::int16: return 2;
    case RecordSetup::Format::float32: return 4;
    case RecordSetup::Format::rows: break;
  }
  return 0;
}

std::vector<double> raw_samples(std::string_view payload, RecordSetup::Format format, bool big_endian) {
  const std::size_t width = bytes_per_sample(format);
  assert(width > 0 && payload.size() % width == 0);
  std::vector<double> samples;
  samples.reserve(payload.size() / width);
  for (std::size_t at = 0; at < payload.size(); at += width) {
    std::uint32_t bits = 0;
    for (std::size_t i = 0; i < width; ++i) {
      const std::size_t from = at + (big_endian ? i : width - 1 - i);
      bits = bits << 8 | static_cast<unsigned char>(payload[from]);
    }
    if (width == 1) samples.push_back(static_cast<double>(static_cast<std::int8_t>(bits)));
    else if (width == 2) samples.push_back(static_cast<double>(static_cast<std::int16_t>(bits)));
    else samples.push_back(static_cast<double>(std::bit_cast<float>(bits)));
  }
  return samples;
}

}  // namespace coilassay

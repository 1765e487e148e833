#include "acquire/byte_source_digest.h"

#include <algorithm>
#include <cstring>
#include <vector>

namespace coilassay {

Result<std::string_view> DigestedBytes::look_ahead(std::size_t count) {
  head_.resize(count);
  const auto got = inner_.read(head_);
  if (!got) return failure(got);
  head_.resize(*got);
  sha256_.add(head_);
  bytes_ += head_.size();
  return head_;
}

Result<std::size_t> DigestedBytes::read(std::span<char> into) {
  const std::size_t again = std::min(into.size(), head_.size() - given_);
  std::memcpy(into.data(), head_.data() + given_, again);
  given_ += again;
  if (again == into.size()) return again;
  const auto got = inner_.read(into.subspan(again));
  if (!got) return failure(got);
  sha256_.add(into.subspan(again, *got));
  bytes_ += *got;
  return again + *got;
}

Result<void> DigestedBytes::drain() {
  std::vector<char> block(std::size_t{1} << 16U);
  for (;;) {
    const auto got = read(block);
    if (!got) return failure(got);
    if (*got == 0) return {};
  }
}

}  // namespace coilassay

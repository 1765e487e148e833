// A look at the beginning of a stream without using it up.
#pragma once

#include <algorithm>
#include <cstring>
#include <string>

#include "acquire/reader.h"

namespace coilassay {

class HeadedBytes final : public ByteSource {
 public:
  explicit HeadedBytes(ByteSource& inner) : inner_(inner) {}

  /// The first bytes, or all of a shorter stream; they are read again. Call once, before the first read().
  Result<std::string_view> look_ahead(std::size_t count) {
    head_.resize(count);
    const auto got = inner_.read(head_);
    if (!got) return failure(got);
    head_.resize(*got);
    return std::string_view(head_);
  }

  const std::string& name() const override { return inner_.name(); }
  std::size_t size_hint() const override { return inner_.size_hint(); }
  void stop() override { inner_.stop(); }
  Result<std::size_t> read(std::span<char> into) override {
    const std::size_t again = std::min(into.size(), head_.size() - given_);
    std::memcpy(into.data(), head_.data() + given_, again);
    given_ += again;
    if (again == into.size()) return again;
    const auto got = inner_.read(into.subspan(again));
    if (!got) return failure(got);
    return again + *got;
  }

 private:
  ByteSource& inner_;
  std::string head_;
  std::size_t given_ = 0;
};

}  // namespace coilassay

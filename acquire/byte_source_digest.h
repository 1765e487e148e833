// The digest of a stream, taken of the blocks that are read anyway.
#pragma once

#include <string>

#include "acquire/reader.h"
#include "base/digest.h"

namespace coilassay {

/// Passes the bytes of another source on and digests them; `head` bytes are kept and given again first.
class DigestedBytes final : public ByteSource {
 public:
  explicit DigestedBytes(ByteSource& inner) : inner_(inner) {}

  /// The first bytes, without using them up.
  Result<std::string_view> look_ahead(std::size_t count);

  const std::string& name() const override { return inner_.name(); }
  std::size_t size_hint() const override { return inner_.size_hint(); }
  Result<std::size_t> read(std::span<char> into) override;

  /// Reads what is left, so that digest and size are those of the whole file.
  Result<void> drain();
  std::size_t bytes() const { return bytes_; }
  std::string digest() { return sha256_.finish(); }

 private:
  ByteSource& inner_;
  Sha256 sha256_;
  std::string head_;
  std::size_t given_ = 0;
  std::size_t bytes_ = 0;
};

}  // namespace coilassay

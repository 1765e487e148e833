// SHA-256 of what was read, so that a result can be traced to its bytes.
#pragma once

#include <memory>
#include <span>
#include <string>

namespace coilassay {

/// Streaming SHA-256 (FIPS 180-4, by OpenSSL).
class Sha256 {
 public:
  Sha256();
  ~Sha256();
  Sha256(Sha256&&) noexcept;
  Sha256& operator=(Sha256&&) noexcept;

  void add(std::span<const char> bytes);
  /// 64 lower-case hexadecimal digits; the object must not be used afterwards.
  std::string finish();

 private:
  struct State;
  std::unique_ptr<State> state_;
};

std::string sha256_of(std::span<const char> bytes);

}  // namespace coilassay

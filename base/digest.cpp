#include "base/digest.h"

#include <fmt/format.h>
#include <openssl/evp.h>

#include <array>
#include <cassert>
#include <new>

namespace coilassay {

struct Sha256::State {
  State() : context(EVP_MD_CTX_new()) {
    // Only a lack of memory can make these fail.
    if (context == nullptr || EVP_DigestInit_ex(context, EVP_sha256(), nullptr) != 1) {
      EVP_MD_CTX_free(context);
      throw std::bad_alloc();
    }
  }
  State(const State&) = delete;
  State& operator=(const State&) = delete;
  ~State() { EVP_MD_CTX_free(context); }

  EVP_MD_CTX* context;
};

Sha256::Sha256() : state_(std::make_unique<State>()) {}
Sha256::~Sha256() = default;
Sha256::Sha256(Sha256&&) noexcept = default;
Sha256& Sha256::operator=(Sha256&&) noexcept = default;

void Sha256::add(std::span<const char> bytes) {
  assert(state_ != nullptr);
  [[maybe_unused]] const int ok = EVP_DigestUpdate(state_->context, bytes.data(), bytes.size());
  assert(ok == 1);
}

std::string Sha256::finish() {
  assert(state_ != nullptr);
  std::array<unsigned char, EVP_MAX_MD_SIZE> digest{};
  unsigned length = 0;
  [[maybe_unused]] const int ok = EVP_DigestFinal_ex(state_->context, digest.data(), &length);
  assert(ok == 1 && length == 32);
  state_.reset();
  std::string text;
  for (unsigned i = 0; i < length; ++i) fmt::format_to(std::back_inserter(text), "{:02x}", unsigned{digest[i]});
  return text;
}

std::string sha256_of(std::span<const char> bytes) {
  Sha256 digest;
  digest.add(bytes);
  return digest.finish();
}

}  // namespace coilassay

#include "base/digest.h"

#include <gtest/gtest.h>

namespace coilassay {
namespace {

// FIPS 180-4 example messages (from memory, checked by an independent implementation).
TEST(Sha256, GivesThePublishedDigests) {
  EXPECT_EQ(sha256_of(std::string_view("")), "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
  EXPECT_EQ(sha256_of(std::string_view("abc")), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
  EXPECT_EQ(sha256_of(std::string_view("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq")),
            "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
}

TEST(Sha256, DoesNotDependOnHowTheBytesArrive) {
  const std::string text(100'000, 'a');
  Sha256 digest;
  for (std::size_t at = 0; at < text.size();) {
    const std::size_t n = std::min<std::size_t>(text.size() - at, 1 + at % 777);
    digest.add(std::span(text).subspan(at, n));
    at += n;
  }
  digest.add({});
  Sha256 moved = std::move(digest);
  EXPECT_EQ(moved.finish(), sha256_of(text));
}

}  // namespace
}  // namespace coilassay

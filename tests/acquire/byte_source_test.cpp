// Opening what a person names: what cannot be read is said in one sentence, with the name in front.
#include <gtest/gtest.h>

#include <string>
#include <vector>

#include "acquire/reader.h"

namespace coilassay {
namespace {

TEST(ByteSource, GivesTheBytesOfAFileInBlocks) {
  const auto bytes = open_bytes("CMakeLists.txt");
  ASSERT_TRUE(bytes);
  std::vector<char> block(100);
  const auto got = (*bytes)->read(block);
  ASSERT_TRUE(got);
  EXPECT_EQ(*got, 100U);
  EXPECT_GT((*bytes)->size_hint(), 100U);
}

TEST(ByteSource, SaysThatAFileIsNotThere) {
  const auto bytes = open_bytes("tests/acquire/data/nothing-here.csv");
  ASSERT_FALSE(bytes);
  EXPECT_EQ(bytes.error().problem, Problem::unreadable);
  EXPECT_EQ(bytes.error().place, "tests/acquire/data/nothing-here.csv");
  EXPECT_EQ(bytes.error().finding, "there is no such file");
}

TEST(ByteSource, SaysThatADirectoryIsNoCapture) {
  const auto bytes = open_bytes("tests/acquire");
  ASSERT_FALSE(bytes);
  EXPECT_EQ(bytes.error().problem, Problem::unreadable);
  EXPECT_NE(bytes.error().finding.find("directory"), std::string::npos);
}

}  // namespace
}  // namespace coilassay

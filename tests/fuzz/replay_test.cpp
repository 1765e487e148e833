// The inputs kept from fuzzing, as ordinary tests: each target's folder in tests/fuzz/corpus. Those that once broke something
// stay there.
#include <gtest/gtest.h>

#include <filesystem>
#include <fstream>
#include <map>
#include <sstream>
#include <string>

#include "tests/fuzz/target.h"

namespace coilassay::fuzz {

namespace {

std::map<std::string, Target>& targets() {
  static std::map<std::string, Target> all;
  return all;
}

}  // namespace

Registered::Registered(const char* name, Target target) { targets()[name] = target; }

namespace {

namespace fs = std::filesystem;

TEST(FuzzCorpus, EveryFolderHasItsTargetAndEveryTargetItsInputs) {
  for (const auto& folder : fs::directory_iterator("tests/fuzz/corpus")) {
    EXPECT_TRUE(targets().contains(folder.path().filename().string())) << folder.path();
  }
  for (const auto& [name, target] : targets()) {
    EXPECT_TRUE(fs::is_directory("tests/fuzz/corpus/" + name)) << name;
  }
}

TEST(FuzzCorpus, IsSmall) {
  std::uintmax_t total = 0;
  for (const auto& input : fs::recursive_directory_iterator("tests/fuzz/corpus")) {
    if (!input.is_regular_file()) continue;
    EXPECT_LT(input.file_size(), 70'000u) << input.path();
    total += input.file_size();
  }
  EXPECT_LT(total, 1'500'000u);
}

class Replay : public testing::TestWithParam<std::string> {};

TEST_P(Replay, EndsWithoutHarm) {
  std::size_t played = 0;
  for (const auto& input : fs::directory_iterator("tests/fuzz/corpus/" + GetParam())) {
    std::ostringstream bytes;
    bytes << std::ifstream(input.path(), std::ios::binary).rdbuf();
    SCOPED_TRACE(input.path().string());
    targets().at(GetParam())(bytes.str());  // ends the program when a property does not hold
    ++played;
  }
  EXPECT_GT(played, 3u);
}

std::vector<std::string> names() {
  std::vector<std::string> all;
  for (const auto& [name, target] : targets()) all.push_back(name);
  return all;
}

INSTANTIATE_TEST_SUITE_P(Fuzz, Replay, testing::ValuesIn(names()), [](const auto& each) { return each.param; });

}  // namespace
}  // namespace coilassay::fuzz

// The habits of DEVELOPERS.md that can be read off the files themselves.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cctype>
#include <filesystem>
#include <set>
#include <sstream>
#include <string>

#include "tests/house/source_tree.h"

namespace coilassay::test {
namespace {

namespace fs = std::filesystem;
using testing::Contains;
using testing::IsEmpty;
using testing::Not;

constexpr std::size_t kMostLines = 500;
const std::vector<std::string> kRooms{"base", "acquire", "fitting", "analysis", "inspection", "ledger", "report", "app"};

std::vector<SourceFile> all_text() {
  return source_files({"base", "acquire", "fitting", "analysis", "inspection", "ledger", "report", "app", "tests", "cmake",
                       "docs", "sample-data", "CMakeLists.txt", "CMakePresets.json", "README.md", "DEVELOPERS.md",
                       "CHANGELOG.md", "NOTICE.md", ".ci/run"},
                      {".h", ".cpp", ".py", ".sh", ".cmake", ".md", ".txt", ".json", ".toml", "run"});
}

/// Words that have no place in a finished text, written in two halves so that this file does not hold them itself.
std::string unwanted_word(const std::string& line) {
  for (const char* word : {"TO" "DO", "FIX" "ME", "/wo" "rk/", "/ho" "me/", "/ro" "ot/"}) {
    if (line.find(word) != std::string::npos) return word;
  }
  return {};
}

/// Files that the CMakeLists.txt files name, as paths from the root. Headers only where they stand under HEADERS.
struct Listed {
  std::set<std::string> sources, headers;
};
Listed listed_files(const std::vector<SourceFile>& lists) {
  Listed listed;
  for (const SourceFile& list : lists) {
    const fs::path folder = fs::path(list.path).parent_path();
    bool headers = false;
    std::string text;
    for (const std::string& line : list.lines) text += line.substr(0, line.find('#')) + ' ';
    for (char& c : text) {
      if (c == '(' || c == ')') c = ' ';
    }
    std::istringstream words(text);
    for (std::string word; words >> word;) {
      const std::string path = (folder / word).lexically_normal().generic_string();
      if (word.ends_with(".cpp")) listed.sources.insert(path);
      else if (word.ends_with(".h") && headers) listed.headers.insert(path);
      else if (word.find('.') == std::string::npos) headers = word == "HEADERS";
    }
  }
  return listed;
}

TEST(HouseRules, NoFileIsLongerThanItsStory) {
  auto below = kRooms;
  below.insert(below.end(), {"tests", "cmake"});
  const auto files = source_files(below, {".h", ".cpp", ".py", ".sh", ".cmake"});
  ASSERT_GT(files.size(), 80u);
  for (const SourceFile& file : files) EXPECT_LE(file.lines.size(), kMostLines) << file.path;
}

TEST(HouseRules, NothingIsLeftForLaterAndNoPathOfOneMachine) {
  const auto files = all_text();
  ASSERT_GT(files.size(), 100u);
  for (const SourceFile& file : files) {
    if (file.path.ends_with(".schema.json") || file.path.find("/data/") != std::string::npos) continue;
    for (std::size_t i = 0; i < file.lines.size(); ++i) {
      EXPECT_EQ(unwanted_word(file.lines[i]), "") << file.path << ":" << i + 1;
    }
  }
  EXPECT_NE(unwanted_word("// TO" "DO: later"), "");
}

TEST(HouseRules, EverySourceFileIsBuilt) {
  const Listed listed = listed_files(source_files({"."}, {"CMakeLists.txt"}));
  auto below = kRooms;
  below.push_back("tests");
  for (const SourceFile& file : source_files(below, {".cpp"})) {
    EXPECT_TRUE(listed.sources.contains(file.path)) << file.path << " is in no CMakeLists.txt";
  }
}

TEST(HouseRules, EveryHeaderOfARoomIsCheckedAlone) {
  // Only those in a file set are: all_verify_interface_header_sets compiles each.
  const Listed listed = listed_files(source_files({"."}, {"CMakeLists.txt"}));
  for (const SourceFile& file : source_files(kRooms, {".h"})) {
    EXPECT_TRUE(listed.headers.contains(file.path)) << file.path << " is not under HEADERS of its room";
  }
}

TEST(HouseRules, FilesThatAreNotThereAreNotListed) {
  const Listed listed = listed_files(source_files({"."}, {"CMakeLists.txt"}));
  for (const std::string& path : listed.sources) EXPECT_TRUE(fs::exists(path)) << path;
  for (const std::string& path : listed.headers) EXPECT_TRUE(fs::exists(path)) << path;
}

TEST(HouseRules, AFileThatIsNotListedIsNoticed) {
  const Listed listed = listed_files({{"base/CMakeLists.txt",
                                       lines_of("coilassay_room(base\n  SOURCES unit.cpp # sheet.cpp\n  HEADERS unit.h\n"
                                                "  PRIVATE other.h)\n")}});
  EXPECT_THAT(listed.sources, Contains("base/unit.cpp"));
  EXPECT_THAT(listed.sources, Not(Contains("base/sheet.cpp")));
  EXPECT_THAT(listed.headers, Contains("base/unit.h"));
  EXPECT_THAT(listed.headers, Not(Contains("base/other.h")));
}

TEST(HouseRules, EveryHeaderIsIncludedOnce) {
  auto below = kRooms;
  below.push_back("tests");
  for (const SourceFile& file : source_files(below, {".h"})) {
    EXPECT_THAT(file.lines, Contains("#pragma once")) << file.path;
  }
}

TEST(HouseRules, SamplesAreSmall) {
  std::uintmax_t total = 0;
  if (!fs::is_directory("sample-data")) GTEST_FAIL() << "sample-data/ is missing";
  for (const auto& entry : fs::recursive_directory_iterator("sample-data")) {
    if (!entry.is_regular_file()) continue;
    EXPECT_LT(entry.file_size(), 600'000u) << entry.path();
    total += entry.file_size();
  }
  EXPECT_LT(total, 8'000'000u);
}

TEST(HouseRules, ScriptsThatAreStartedByNameMayBeStarted) {
  const auto may_run = fs::status(".ci/run").permissions() & fs::perms::owner_exec;
  EXPECT_NE(may_run, fs::perms::none);
}

}  // namespace
}  // namespace coilassay::test

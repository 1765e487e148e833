// Rooms include only downward, and each heavy or foreign library is known to one file (DEVELOPERS.md).
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <map>
#include <set>
#include <string>

#include "tests/house/source_tree.h"

namespace coilassay::test {
namespace {

using testing::Contains;
using testing::HasSubstr;
using testing::IsEmpty;

/// What a room may include besides itself. Two rooms lie inside others: the circuits that must not know the fits, and the
/// runs that must not know the keyboard.
const std::map<std::string, std::set<std::string>>& allowed() {
  static const std::map<std::string, std::set<std::string>> rooms{
      {"base", {}},
      {"acquire", {"base", "acquire/synthetic"}},
      {"acquire/synthetic", {"base", "acquire"}},
      {"fitting", {"base"}},
      {"analysis", {"base", "acquire", "fitting"}},
      {"inspection", {"base", "fitting", "analysis"}},
      {"ledger", {"base", "analysis", "inspection"}},
      {"report", {"base", "analysis", "inspection", "ledger"}},
      {"app/runs", {"base", "acquire", "acquire/synthetic", "fitting", "analysis", "inspection", "ledger", "report"}},
      {"app/commands",
       {"base", "acquire", "acquire/synthetic", "fitting", "analysis", "inspection", "ledger", "report", "app/runs"}},
      {"app", {"base", "app/commands"}},
  };
  return rooms;
}

/// Library header and the one file that may include it ("" : one file, whichever).
struct OneFileOnly {
  const char* header;   // how the include begins
  const char* file;
};
constexpr OneFileOnly kOneFileOnly[] = {{"CLI/", "app/commands/command_line.cpp"},
                                        {"fftw3.h", "fitting/spectrum.cpp"},
                                        {"ceres/ceres.h", "fitting/least_squares.cpp"},
                                        {"libserialport.h", ""},
                                        {"soci/", ""},
                                        {"sndfile", "acquire/wav_reader.cpp"}};

std::string room_of(const std::string& path) {
  std::string best;
  for (const auto& [room, below] : allowed()) {
    if (path.starts_with(room + "/") && room.size() > best.size()) best = room;
  }
  return best;
}

/// What is wrong with the includes of these files, a sentence each.
std::vector<std::string> upward_includes(const std::vector<SourceFile>& files) {
  std::vector<std::string> wrong;
  for (const SourceFile& file : files) {
    const std::string room = room_of(file.path);
    for (const Include& include : includes_of(file.lines)) {
      const std::string to = room_of(include.name);
      const std::string place = file.path + ":" + std::to_string(include.line) + ": ";
      if (include.name.find("..") != std::string::npos) {
        wrong.push_back(place + "an include path with '..' hides its room: " + include.name);
      } else if (include.angled && !to.empty()) {
        wrong.push_back(place + "our own headers stand in quotes: " + include.name);
      } else if (!include.angled && to.empty()) {
        wrong.push_back(place + "not a header of a room: " + include.name);
      } else if (!to.empty() && to != room && !allowed().at(room).contains(to)) {
        wrong.push_back(place + room + " may not include " + to + ": " + include.name);
      }
    }
  }
  return wrong;
}

std::vector<std::string> libraries_in_several_files(const std::vector<SourceFile>& files) {
  std::vector<std::string> wrong;
  for (const OneFileOnly& rule : kOneFileOnly) {
    std::set<std::string> users;
    for (const SourceFile& file : files) {
      for (const Include& include : includes_of(file.lines)) {
        if (include.name.starts_with(rule.header)) users.insert(file.path);
      }
    }
    if (*rule.file != '\0') users.erase(rule.file);
    const bool fine = *rule.file != '\0' ? users.empty() : users.size() <= 1;
    if (fine) continue;
    std::string sentence = std::string(rule.header) + " is for one source file, and is included in";
    for (const std::string& user : users) sentence += " " + user;
    wrong.push_back(sentence);
  }
  return wrong;
}

std::vector<SourceFile> rooms() {
  return source_files({"base", "acquire", "fitting", "analysis", "inspection", "ledger", "report", "app"}, {".h", ".cpp"});
}

SourceFile planted(const std::string& path, const std::string& text) { return {path, lines_of(text)}; }

TEST(Layering, RoomsIncludeOnlyDownward) {
  const auto files = rooms();
  ASSERT_GT(files.size(), 50u) << "the tests must run in the source folder";
  EXPECT_THAT(upward_includes(files), IsEmpty());
}

TEST(Layering, HeavyLibrariesAreKnownToOneFile) { EXPECT_THAT(libraries_in_several_files(rooms()), IsEmpty()); }

TEST(Layering, EveryFolderOfTheSourceIsARoomThatHasRules) {
  for (const SourceFile& file : rooms()) EXPECT_NE(room_of(file.path), "") << file.path;
}

TEST(Layering, AnUpwardIncludeIsCaughtWithItsLine) {
  const auto wrong = upward_includes({planted("base/unit.cpp", "// words\n#include \"analysis/budget.h\"\n")});
  ASSERT_EQ(wrong.size(), 1u);
  EXPECT_THAT(wrong[0], HasSubstr("base/unit.cpp:2: base may not include analysis"));
}

TEST(Layering, NeighboursThatNeverMeetAreCaughtBothWays) {
  EXPECT_EQ(upward_includes({planted("acquire/reader.cpp", "#include \"fitting/fit.h\"\n")}).size(), 1u);
  EXPECT_EQ(upward_includes({planted("fitting/fit.cpp", "#include \"acquire/capture.h\"\n")}).size(), 1u);
}

TEST(Layering, SimulatedTruthStaysApartFromTheFits) {
  for (const char* upper : {"fitting/damped_sine.h", "analysis/ring_down.h"}) {
    const auto wrong = upward_includes(
        {planted("acquire/synthetic/ring_down.cpp", std::string("#include \"base/random.h\"\n#include \"") + upper + "\"\n")});
    EXPECT_EQ(wrong.size(), 1u) << upper;
  }
}

TEST(Layering, RunsThatKnowTheKeyboardAreCaught) {
  EXPECT_EQ(upward_includes({planted("app/runs/run.cpp", "#include \"app/commands/console.h\"\n")}).size(), 1u);
  EXPECT_EQ(upward_includes({planted("app/commands/run.cpp", "#include \"app/runs/captures.h\"\n")}).size(), 0u);
}

TEST(Layering, WaysAroundTheRuleAreCaught) {
  EXPECT_EQ(upward_includes({planted("base/unit.cpp", "#include \"../analysis/budget.h\"\n")}).size(), 1u);
  EXPECT_EQ(upward_includes({planted("base/unit.cpp", "#include <analysis/budget.h>\n")}).size(), 1u);
  EXPECT_EQ(upward_includes({planted("base/unit.cpp", "#include \"budget.h\"\n")}).size(), 1u);
  EXPECT_EQ(upward_includes({planted("base/unit.cpp", "  #  include \"analysis/budget.h\"\n")}).size(), 1u);
}

TEST(Layering, ALibraryInASecondFileIsCaught) {
  EXPECT_EQ(libraries_in_several_files({planted("report/svg.cpp", "#include <fftw3.h>\n")}).size(), 1u);
  EXPECT_EQ(libraries_in_several_files({planted("acquire/serial.cpp", "#include <libserialport.h>\n")}).size(), 0u);
  EXPECT_EQ(libraries_in_several_files({planted("acquire/serial.cpp", "#include <libserialport.h>\n"),
                                        planted("acquire/ports.cpp", "#include <libserialport.h>\n")})
                .size(),
            1u);
}

}  // namespace
}  // namespace coilassay::test

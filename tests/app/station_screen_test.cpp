// What an operator sees.
#include "app/commands/station_screen.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <sstream>

#include "app/commands/block_letters.h"
#include "report/text_layout.h"

namespace coilassay {
namespace {

using testing::HasSubstr;
using testing::Not;

UnitVerdict unit_of(const std::string& serial, Verdict verdict) {
  UnitVerdict unit;
  unit.serial = serial;
  unit.attempt = 1;
  unit.verdict = verdict;
  LimitVerdict limit;
  limit.quantity = "L_s";
  limit.unit = Unit::henry;
  limit.value = 47e-6;
  limit.U = 1e-7;
  limit.min = 45e-6;
  limit.max = 49e-6;
  limit.verdict = verdict;
  unit.limits.push_back(limit);
  return unit;
}

std::string screen_of(const UnitVerdict& unit, TextStyle style) {
  std::ostringstream out;
  StationScreen screen(out, style);
  StationProgress progress;
  progress.part = "drum-47";
  progress.lot = "7";
  progress.units = 3;
  progress.first_pass = 2;
  progress.standing_pass = 3;
  progress.n = 20;
  progress.accept = 1;
  screen.unit({unit, unit, 1, 0.1}, progress);
  return out.str();
}

TEST(BlockLetters, AWordIsSevenRowsHighAndFitsTheWidth) {
  for (const std::size_t width : {40u, 80u, 120u}) {
    for (const char* word : {"PASS", "FAIL", "UNDECIDED", "NO VERDICT", "NO READING"}) {
      const auto rows = block_letters(BlockSign::question, word, width, Script::utf8);
      ASSERT_EQ(rows.size(), 7u);
      for (const std::string& row : rows) EXPECT_LE(display_width(row), width) << word;
    }
  }
}

TEST(BlockLetters, DrawsTheLettersOfAWord) {
  const auto rows = block_letters(BlockSign::none, "LI", 12, Script::ascii);
  EXPECT_THAT(rows, testing::ElementsAre("#     #####", "#       #", "#       #", "#       #", "#       #", "#       #", "##### #####"));
}

TEST(BlockLetters, AreTwiceAsWideWhereThereIsRoom) {
  EXPECT_EQ(block_letters(BlockSign::none, "L", 80, Script::ascii).back(), "##########");
}

TEST(StationScreen, TheVerdictsDifferInShapeNotOnlyInColour) {
  TextStyle plain;
  plain.color = false;
  std::string before;
  for (const Verdict verdict : {Verdict::pass, Verdict::fail, Verdict::undecided, Verdict::not_comparable}) {
    const std::string screen = screen_of(unit_of("1", verdict), plain);
    const std::string letters = screen.substr(0, screen.find("L_s"));
    EXPECT_NE(letters, before);
    before = letters;
    EXPECT_THAT(screen, Not(HasSubstr("\x1b[1;"))) << "no colour unless wanted";
  }
}

TEST(StationScreen, RingsTheBellShowsCountsAndAsksNothing) {
  const auto bells = [](const std::string& screen) { return std::count(screen.begin(), screen.end(), '\a'); };
  const std::string pass = screen_of(unit_of("0017", Verdict::pass), {});
  EXPECT_EQ(bells(pass), 1);
  EXPECT_EQ(bells(screen_of(unit_of("0017", Verdict::fail), {})), 3);
  EXPECT_THAT(pass, HasSubstr("3 units of 20, 0 fail (the plan allows 1)"));
  EXPECT_THAT(pass, HasSubstr("yield 66.7 % at the first attempt (2 of 3), 100 % in the end"));
  EXPECT_THAT(pass, HasSubstr("0017             passes"));
  EXPECT_THAT(pass, Not(HasSubstr("?"))) << "no modal question";
}

TEST(StationScreen, OutsideTextCannotDriveTheTerminal) {
  TextStyle plain;
  plain.color = false;
  std::string screen = screen_of(unit_of("00\x1b]0;owned\a17", Verdict::pass), plain);
  EXPECT_THAT(screen, HasSubstr("00\\x1b]0;owned\\x0717"));
  EXPECT_EQ(std::count(screen.begin(), screen.end(), '\a'), 1) << "the station's own bell";
}

}  // namespace
}  // namespace coilassay

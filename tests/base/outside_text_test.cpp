#include "base/outside_text.h"

#include <gtest/gtest.h>

#include <array>
#include <vector>

namespace coilassay {
namespace {

TEST(Shown, LeavesOrdinaryTextOfAnyLanguageAlone) {
  for (const std::string_view text : {"ring.csv", "Länge µH Ω °C", "磁気", "a\\b", "\U0001f600", ""}) {
    EXPECT_EQ(shown(text), text);
  }
}

TEST(Shown, MakesWhatSteersOrHidesVisible) {
  const std::pair<std::string_view, std::string_view> cases[] = {
      {"a\x1b[2Jb", "a\\x1b[2Jb"},
      {"a\nb\rc\td", "a\\x0ab\\x0dc\\x09d"},
      {{"a\0b", 3}, "a\\x00b"},
      {"\x7f", "\\x7f"},
      {"\u0085\u009b", "\\u0085\\u009b"},          // C1: 9b starts a control sequence
      {"\u202egnp", "\\u202egnp"},                  // right-to-left override
      {"\u202a\u202b\u202c\u202d", "\\u202a\\u202b\\u202c\\u202d"},
      {"\u2066\u2067\u2068\u2069", "\\u2066\\u2067\\u2068\\u2069"},
      {"\u200e\u200f\u061c", "\\u200e\\u200f\\u061c"},
      {"\u2028\u2029", "\\u2028\\u2029"},
      {"\ufeffx\u200by", "\\ufeffx\\u200by"},
      {"\U000e0041", "\\U000e0041"},
  };
  for (const auto& [text, expected] : cases) EXPECT_EQ(shown(text), expected);
}

TEST(Shown, ShowsBytesThatAreNoUtf8) {
  EXPECT_EQ(shown("a\xff\xfe z"), "a\\xff\\xfe z");
  EXPECT_EQ(shown("\xc2"), "\\xc2");                       // cut short
  EXPECT_EQ(shown("\xc0\xaf"), "\\xc0\\xaf");              // overlong
  EXPECT_EQ(shown("\xed\xa0\x80"), "\\xed\\xa0\\x80");     // a surrogate
  EXPECT_EQ(shown("\xe9t\xe9"), "\\xe9t\\xe9");            // Latin-1
}

TEST(Shown, NeverLongerThanTheLimitAndNeverInsideACharacter) {
  EXPECT_EQ(shown("abcde", 5), "abcde");
  EXPECT_EQ(shown("abcdef", 5), "abcd…");
  EXPECT_EQ(shown("ΩΩΩΩΩΩ", 5), "ΩΩΩΩ…");
  EXPECT_EQ(shown("ab\x1b\x1b", 6), "ab…");   // half an escape would mislead
  EXPECT_EQ(shown("ab\x1b", 6), "ab\\x1b");
  EXPECT_EQ(shown("abc", 0), "");
  EXPECT_EQ(shown(std::string(10'000'000, 'x')), std::string(199, 'x') + "…");
  EXPECT_EQ(shown(std::string(10'000'000, '\xff'), 9), "\\xff\\xff…");
}

TEST(CsvCell, KeepsFormulasFromSpreadsheets) {
  EXPECT_EQ(csv_cell("=1+1"), "'=1+1");
  EXPECT_EQ(csv_cell("+cmd"), "'+cmd");
  EXPECT_EQ(csv_cell("-x"), "'-x");
  EXPECT_EQ(csv_cell("@SUM(A1)"), "'@SUM(A1)");
  EXPECT_EQ(csv_cell("\t=1"), "\"'\t=1\"");
  EXPECT_EQ(csv_cell("\r=1"), "\"'\r=1\"");
  EXPECT_EQ(csv_cell("=a,b"), "\"'=a,b\"");
  for (const std::string_view number : {"-1.5e-3", "+2", "-7", "1.5"}) EXPECT_EQ(csv_cell(number), number);
  EXPECT_EQ(csv_cell("-1+1"), "'-1+1");
}

TEST(CsvCell, QuotesOnlyWhatNeedsIt) {
  EXPECT_EQ(csv_cell("plain"), "plain");
  EXPECT_EQ(csv_cell(""), "");
  EXPECT_EQ(csv_cell("a,b"), "\"a,b\"");
  EXPECT_EQ(csv_cell("a;b"), "\"a;b\"");
  EXPECT_EQ(csv_cell("say \"L\""), "\"say \"\"L\"\"\"");
  EXPECT_EQ(csv_cell("a\nb"), "\"a\nb\"");
  EXPECT_EQ(csv_cell(" a"), "\" a\"");
}

TEST(Identifier, HasLettersDigitsAndUnderscoreOnly) {
  EXPECT_EQ(identifier("drum-47"), "drum_47");
  EXPECT_EQ(identifier("47 drum"), "_47_drum");
  EXPECT_EQ(identifier(""), "_");
  EXPECT_EQ(identifier("a\n.system rm"), "a__system_rm");
  EXPECT_EQ(identifier("Ωx\xff"), "_x_");
  EXPECT_LE(identifier(std::string(100'000, 'a')).size(), 101U);
}

TEST(EditDistance, CountsInsertDeleteReplaceAndSwap) {
  EXPECT_EQ(edit_distance("", ""), 0U);
  EXPECT_EQ(edit_distance("abc", "abc"), 0U);
  EXPECT_EQ(edit_distance("abc", ""), 3U);
  EXPECT_EQ(edit_distance("abc", "abcd"), 1U);
  EXPECT_EQ(edit_distance("abc", "axc"), 1U);
  EXPECT_EQ(edit_distance("abc", "acb"), 1U);
  EXPECT_EQ(edit_distance("kitten", "sitting"), 3U);
  EXPECT_EQ(edit_distance(std::string(1'000'000, 'a'), "b"), 1'000'000U);
}

TEST(Nearest, SuggestsANeighbourAndNothingWhenNoneIsNear) {
  const std::array<std::string_view, 3> known = {"voltage", "current", "capacitor"};
  EXPECT_EQ(nearest("volage", known), "voltage");
  EXPECT_EQ(nearest("capcaitor", known), "capacitor");
  EXPECT_EQ(nearest("stimulus", known), "");
  EXPECT_EQ(nearest("x", std::vector<std::string>{}), "");
}

}  // namespace
}  // namespace coilassay

#include "report/result_text.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <algorithm>

#include "report/text_layout.h"
#include "tests/report/made_up.h"

namespace coilassay {
namespace {

using ::testing::HasSubstr;
using ::testing::Not;

std::vector<std::string> lines(const std::string& text) {
  std::vector<std::string> list;
  for (std::size_t begin = 0; begin < text.size();) {
    const std::size_t end = std::min(text.find('\n', begin), text.size());
    list.push_back(text.substr(begin, end - begin));
    begin = end + 1;
  }
  return list;
}

std::string line_with(const std::string& text, std::string_view part) {
  for (const std::string& line : lines(text)) {
    if (line.find(part) != std::string::npos) return line;
  }
  return {};
}

TEST(ResultText, SaysValuesThenCompositionThenWarningsThenAdvice) {
  const std::string text = to_text(test::made_up_ring_down(), TextStyle{});
  const std::size_t values = text.find("Values"), made = text.find("What the uncertainty is made of"),
                    watch = text.find("What to watch out for"), next = text.find("What to do next");
  ASSERT_NE(next, std::string::npos) << text;
  EXPECT_LT(values, made);
  EXPECT_LT(made, watch);
  EXPECT_LT(watch, next);
  EXPECT_THAT(text, HasSubstr("series inductance"));
  EXPECT_THAT(text, HasSubstr("± 0.45 µH"));  // 1.65 x 0.271 uH
  EXPECT_THAT(text, HasSubstr("(95 %)"));
  EXPECT_THAT(line_with(text, "L_s  capacitor"), HasSubstr("capacitor 98 %"));
  EXPECT_THAT(text, HasSubstr("at least 10.00 MHz"));
  EXPECT_THAT(text, HasSubstr("Conditions: frequency 232.0 kHz, peak current 72.90 mA"));
}

TEST(ResultText, DeviationsStandBelowEachOther) {
  const std::string text = to_text(test::made_up_ring_down(), TextStyle{});
  std::vector<std::size_t> columns;
  for (const std::string& line : lines(text)) {
    const std::size_t at = line.find("±");
    if (at != std::string::npos) columns.push_back(display_width(line.substr(0, at)));
  }
  ASSERT_GE(columns.size(), 5u);
  EXPECT_EQ(std::count(columns.begin(), columns.end(), columns.front()), static_cast<std::ptrdiff_t>(columns.size()));
}

TEST(ResultText, CautionsComeBeforeNotes) {
  const std::string text = to_text(test::made_up_ring_down(), TextStyle{});
  EXPECT_LT(text.find("caution  a second mode"), text.find("note     99 %"));
  EXPECT_THAT(text, HasSubstr("(threshold from"));
}

TEST(ResultText, NamesWhatWasTakenByDefault) {
  const std::string text = to_text(test::made_up_ring_down(), TextStyle{});
  EXPECT_THAT(text, HasSubstr("Not stated, so taken: capacitor loss: 0.0005, a film capacitor was assumed"));
  EXPECT_THAT(text, Not(HasSubstr("passive probe was assumed")));  // under one percent of the variance
}

TEST(ResultText, ARefusalSaysFirstWhatWhyAndWhatToDo) {
  const std::string text = to_text(test::made_up_refusal(), TextStyle{});
  const std::size_t what = text.find("Not measured: the natural frequency f_0"),
                    why = text.find("nothing that rings was found"), todo = text.find("trigger on the release"),
                    rest = text.find("0.4 periods");
  ASSERT_NE(what, std::string::npos) << text;
  EXPECT_LT(what, why);
  EXPECT_LT(why, todo);
  EXPECT_LT(todo, rest);
  EXPECT_EQ(text.find("nothing that rings", why + 1), std::string::npos);  // once
  EXPECT_THAT(text, Not(HasSubstr("Values")));
}

TEST(ResultText, AnIntervalWithDifferentHalvesShowsBothEnds) {
  const std::string text = to_text(test::made_up_ramp(), TextStyle{});
  EXPECT_THAT(line_with(text, "I_sat_30 "), HasSubstr("2.270 A to 2.490 A"));
}

TEST(ResultText, KeepsToTheWidth) {
  Measurement m = test::made_up_ring_down();
  m.sources.front().source.name = std::string(180, 'n') + ".csv";
  for (const std::size_t width : {60u, 80u, 120u}) {
    TextStyle style;
    style.width = width;
    for (const std::string& line : lines(to_text(m, style))) {
      if (line.find("(95 %)") != std::string::npos) continue;  // a row of values is never broken
      EXPECT_LE(display_width(line), width) << line;
    }
  }
  for (const std::string& line : lines(to_text(test::made_up_ring_down(), TextStyle{})))
    EXPECT_LE(display_width(line), 80u) << line;
}

TEST(ResultText, PointsStandInATable) {
  const std::string text = to_text(test::made_up_line(), TextStyle{});
  EXPECT_THAT(text, HasSubstr("Point by point"));
  EXPECT_THAT(line_with(text, "4.7 nF"), HasSubstr("ring.csv"));
  EXPECT_THAT(line_with(text, "22 nF"), HasSubstr(" kHz"));
  const std::string sine = to_text(test::made_up_sine(), TextStyle{});
  EXPECT_THAT(line_with(sine, "100 kHz"), HasSubstr("47.00(20) µH"));
  Measurement many = test::made_up_sine();
  many.points.resize(30, many.points.front());
  EXPECT_THAT(to_text(many, TextStyle{}), HasSubstr("and 18 more with --verbose"));
}

TEST(ResultText, AsciiHasNoByteAbove127) {
  TextStyle style;
  style.script = Script::ascii;
  style.verbose = true;
  for (const Measurement& m :
       {test::made_up_ring_down(), test::made_up_line(), test::made_up_refusal(), test::made_up_ramp(),
        test::made_up_sine(), test::with_hostile_names(test::made_up_ring_down())}) {
    const std::string text = to_text(m, style);
    EXPECT_TRUE(std::all_of(text.begin(), text.end(), [](char c) { return static_cast<unsigned char>(c) < 0x80; }))
        << text;
  }
  EXPECT_THAT(to_text(test::made_up_ring_down(), style), HasSubstr("+/- 0.45 uH"));
}

TEST(ResultText, ColourOnlyWhenAskedAndNeverAlone) {
  TextStyle style;
  EXPECT_THAT(to_text(test::made_up_ring_down(), style), Not(HasSubstr("\x1b")));
  style.color = true;
  std::string text = to_text(test::made_up_ring_down(), style);
  EXPECT_THAT(text, HasSubstr("\x1b[1;33mcaution\x1b[0m"));
  for (std::size_t at; (at = text.find('\x1b')) != std::string::npos;) text.erase(at, text.find('m', at) + 1 - at);
  EXPECT_EQ(text, to_text(test::made_up_ring_down(), TextStyle{}));
}

TEST(ResultText, VerboseAddsBudgetCorrelationsCorrectionsAndDigests) {
  TextStyle style;
  style.verbose = true;
  const std::string text = to_text(test::made_up_ring_down(), style);
  for (const char* part : {"Budget of series inductance L_s", "passive probe was assumed", "Correlations", "+0.310",
                           "probe capacitance", "damped sine, converged", "SBW-114"}) {
    EXPECT_THAT(text, HasSubstr(part));
  }
  EXPECT_THAT(text, HasSubstr(std::string(64, 'a')));
  EXPECT_THAT(to_text(test::made_up_ring_down(), TextStyle{}), Not(HasSubstr(std::string(64, 'a'))));
}

TEST(ResultText, ManyNotesAreNamedNotToldUnlessVerbose) {
  Measurement m = test::made_up_ring_down();
  m.findings.clear();
  for (int i = 0; i < 6; ++i)
    m.findings.push_back(
        {"note_" + std::to_string(i), Severity::note, "remark " + std::to_string(i), "", 0, Unit::one});
  const std::string text = to_text(m, TextStyle{});
  EXPECT_THAT(text, HasSubstr("remark 2"));
  EXPECT_THAT(text, Not(HasSubstr("remark 3")));
  EXPECT_THAT(text, HasSubstr("further notes with --verbose: note_3, note_4, note_5"));
  TextStyle style;
  style.verbose = true;
  EXPECT_THAT(to_text(m, style), HasSubstr("remark 5"));
}

TEST(ResultText, HostileNamesCannotReachTheTerminal) {
  TextStyle style;
  style.verbose = true;
  const std::string text = to_text(test::with_hostile_names(test::made_up_ring_down()), style);
  for (const char* forbidden : {"\x1b", "\xe2\x80\xae", "\xff", "\n!touch"})
    EXPECT_THAT(text, Not(HasSubstr(forbidden)));
}

TEST(ErrorText, ShowsPlaceFindingAndRemedyEscaped) {
  const Error error{Problem::missing_column, "ring\n.csv:3", "no column 'x\x1b'", "name it with --voltage µ"};
  EXPECT_EQ(to_text(error, TextStyle{}), "ring\\x0a.csv:3: no column 'x\\x1b'\n  try: name it with --voltage µ\n");
  TextStyle ascii;
  ascii.script = Script::ascii;
  EXPECT_EQ(to_text(Error{Problem::usage, "", "finding", ""}, ascii), "finding\n");
}

}  // namespace
}  // namespace coilassay

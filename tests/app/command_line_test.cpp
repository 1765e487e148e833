#include "app/commands/command_line.h"

#include <gmock/gmock.h>

#include "app/commands/arguments.h"
#include "base/random.h"

namespace coilassay {
namespace {

using testing::ElementsAre;
using testing::HasSubstr;

Command made_up(std::size_t most = 9) {
  return {
      .name = "weigh",
      .positional = {.name = "FILE", .help = "what to weigh", .least = 0, .most = most},
      .groups = {
          {.title = "All",
           .options = {{.name = "--capacitor",
                        .kind = ValueKind::stated,
                        .value_name = "VALUE",
                        .example = "10nF±1%",
                        .unit = Unit::farad,
                        .range = Range::positive,
                        .repeatable = true},
                       {.name = "--capacitor-loss",
                        .kind = ValueKind::stated,
                        .value_name = "VALUE",
                        .range = Range::not_negative},
                       {.name = "--from", .kind = ValueKind::plain, .value_name = "TIME", .unit = Unit::second},
                       {.name = "--gain", .kind = ValueKind::stated, .value_name = "VALUE", .range = Range::not_zero},
                       {.name = "--room",
                        .kind = ValueKind::stated,
                        .value_name = "VALUE",
                        .unit = Unit::degree_celsius,
                        .range = Range::above_absolute_zero},
                       {.name = "--name", .kind = ValueKind::text, .value_name = "TEXT"},
                       {.name = "--trials",
                        .kind = ValueKind::count,
                        .value_name = "N",
                        .example = "1000",
                        .least = 10,
                        .most = 5000},
                       {.name = "--how", .kind = ValueKind::choice, .value_name = "HOW", .choices = {"fast", "well"}},
                       {.name = "--json"},
                       {.name = "--help"},
                       {.name = "-o", .kind = ValueKind::file, .value_name = "FILE"}}}}};
}

/// "--name=value" of each option, in order.
std::vector<std::string> options_of(const SplitLine& line) {
  std::vector<std::string> all;
  for (const auto& [option, text] : line.options) all.push_back(std::string(option->name) + "=" + text);
  return all;
}

std::string trouble(const std::vector<std::string>& words, const Command& command = made_up()) {
  const Result<Arguments> read = read_arguments(command, words);
  return read ? "" : read.error().place + ": " + read.error().finding + " -> " + read.error().remedy;
}

TEST(CommandLine, TakesValuesAfterABlankOrAnEqualsSign) {
  const Command command = made_up();
  const auto line = split_command_line(command, {"a.csv", "--name", "x y", "--from=2us", "-o", "out", "b.csv"});
  ASSERT_TRUE(line) << line.error().finding;
  EXPECT_THAT(options_of(*line), ElementsAre("--from=2us", "--name=x y", "-o=out"));
  EXPECT_THAT(line->words, ElementsAre("a.csv", "b.csv"));
}

TEST(CommandLine, TakesValuesThatBeginWithAMinus) {
  const Command command = made_up();
  for (const auto& words : std::vector<std::vector<std::string>>{{"--from", "-5us"}, {"--from=-5us"}}) {
    const auto read = read_arguments(command, words);
    ASSERT_TRUE(read);
    EXPECT_EQ(read->plain("--from"), -5e-6);
  }
}

TEST(CommandLine, KeepsValuesAsTheyAreTyped) {
  const Command command = made_up();
  for (const std::string text : {"[a,b]", "a=b", "\"quoted\"", "--", " blank ", "{}", "'", "a,b", "µ", "-", "%"}) {
    if (text == "--") continue;
    const auto line = split_command_line(command, {"--name=" + text});
    ASSERT_TRUE(line) << text;
    EXPECT_THAT(options_of(*line), ElementsAre("--name=" + text));
    const auto words = split_command_line(command, {"--", text});
    ASSERT_TRUE(words) << text;
    EXPECT_THAT(words->words, ElementsAre(text));
  }
}

TEST(CommandLine, TakesAShortOptionWithItsValueAttached) {
  const Command command = made_up();
  for (const char* word : {"-oout", "-o=out"}) {
    const auto line = split_command_line(command, {word});
    ASSERT_TRUE(line) << word;
    EXPECT_THAT(options_of(*line), ElementsAre("-o=out"));
  }
}

TEST(CommandLine, KeepsRepeatedOptionsInTheirOrder) {
  const Command command = made_up();
  const auto line =
      split_command_line(command, {"--capacitor", "1n", "a", "--capacitor=2n", "--json", "--capacitor", "3n"});
  ASSERT_TRUE(line);
  EXPECT_THAT(options_of(*line), ElementsAre("--capacitor=1n", "--capacitor=2n", "--capacitor=3n", "--json="));
}

TEST(CommandLine, TakesEverythingAfterTwoDashesAsAWord) {
  const Command command = made_up();
  const auto line = split_command_line(command, {"--json", "--", "--name", "-x", "-"});
  ASSERT_TRUE(line);
  EXPECT_THAT(line->words, ElementsAre("--name", "-x", "-"));
}

TEST(CommandLine, TakesAMinusAloneAsStandardInput) {
  const Command command = made_up();
  const auto line = split_command_line(command, {"-", "--json"});
  ASSERT_TRUE(line);
  EXPECT_THAT(line->words, ElementsAre("-"));
}

TEST(CommandLine, NamesTheNearestOption) {
  EXPECT_THAT(trouble({"--capactor", "3"}),
              HasSubstr("--capactor: weigh has no such option -> did you mean --capacitor?"));
  EXPECT_THAT(trouble({"--cap=1n"}), HasSubstr("--cap: weigh has no such option -> did you mean --capacitor?"));
  EXPECT_THAT(trouble({"--capacitor-l=1"}), HasSubstr("did you mean --capacitor-loss?"));
  EXPECT_THAT(trouble({"--entirely-different"}), HasSubstr("-> coilassay help weigh lists its options"));
  EXPECT_THAT(trouble({"-5n"}), HasSubstr("-5n: weigh has no such option"));
}

TEST(CommandLine, MissesAValueThatIsNotThere) {
  EXPECT_THAT(trouble({"--capacitor"}),
              HasSubstr("--capacitor: the option has no value -> write it like --capacitor 10nF±1%"));
  EXPECT_THAT(trouble({"--capacitor", "--json"}), HasSubstr("--capacitor: the option has no value"));
  EXPECT_THAT(trouble({"--name", "--", "a"}), HasSubstr("--name: the option has no value"));
  EXPECT_THAT(trouble({"--name="}), HasSubstr("--name: the value is empty"));
  EXPECT_THAT(trouble({"--name", ""}), HasSubstr("--name: the value is empty"));
}

TEST(CommandLine, RefusesAValueForAFlag) {
  EXPECT_THAT(trouble({"--json=no"}), HasSubstr("--json: the option takes no value"));
}

TEST(CommandLine, RefusesAnOptionTwiceUnlessItMayRepeat) {
  EXPECT_THAT(trouble({"--from", "1s", "--from=2s"}), HasSubstr("--from: the option is given twice"));
  EXPECT_EQ(trouble({"--json", "--json"}), "");
}

TEST(CommandLine, CountsItsWords) {
  EXPECT_THAT(trouble({"a", "b"}, made_up(1)), HasSubstr("there is no use for 'b'"));
  EXPECT_THAT(trouble({"a"}, made_up(0)), HasSubstr("there is no use for 'a'"));
  Command needs = made_up();
  needs.positional.least = 1;
  EXPECT_THAT(trouble({}, needs), HasSubstr("coilassay weigh: no FILE is given -> coilassay weigh FILE..."));
  EXPECT_EQ(trouble({"--help"}, needs), "");
}

TEST(Arguments, ReadsValuesWithTheirUnitAndLaw) {
  const Command command = made_up();
  const auto read = read_arguments(command, {"--capacitor", "10nF±1%", "--capacitor", "4n7", "--trials", "10"});
  ASSERT_TRUE(read);
  const auto all = read->all_stated("--capacitor");
  ASSERT_EQ(all.size(), 2u);
  EXPECT_EQ(all[0].value, 10e-9);
  EXPECT_EQ(all[0].law, Law::rectangular);
  EXPECT_EQ(all[1].value, 4.7e-9);
  EXPECT_EQ(all[1].law, Law::unstated);
  EXPECT_EQ(read->count("--trials"), 10u);
  EXPECT_FALSE(read->plain("--from"));
}

struct BadValue {
  std::vector<std::string> words;
  std::string expected;
};

TEST(Arguments, RefusesBadValuesAtTheirOption) {
  const std::vector<BadValue> table = {
      {{"--capacitor", "-5nF"}, "--capacitor: '-5nF' is not above zero"},
      {{"--capacitor=-5n"}, "--capacitor: '-5n' is not above zero"},
      {{"--capacitor", "0"}, "--capacitor: '0' is not above zero"},
      {{"--capacitor", "10nF±100%"}, "--capacitor: '10nF±100%' has a tolerance that reaches down to zero"},
      {{"--capacitor", "10uH"}, "--capacitor: '10uH' is an inductance (H)"},
      {{"--capacitor", "10uH"}, "write it like --capacitor 10nF±1%"},
      {{"--capacitor", "nan"}, "--capacitor: "},
      {{"--capacitor", "1e400"}, "--capacitor: "},
      {{"--capacitor", "ten"}, "--capacitor: "},
      {{"--capacitor", "1,5nF"}, "--capacitor: "},
      {{"--capacitor-loss", "-0.1"}, "--capacitor-loss: '-0.1' is below zero"},
      {{"--capacitor-loss", "0.1±0.2"}, "--capacitor-loss: '0.1±0.2' has a tolerance that reaches below zero"},
      {{"--gain", "0"}, "--gain: '0' is zero"},
      {{"--gain", "-1±100%"}, "--gain: '-1±100%' has a tolerance as large as the value"},
      {{"--room", "-300degC"}, "--room: '-300degC' is below absolute zero"},
      {{"--from", "2us±1us"}, "--from: '2us±1us' has a tolerance, which means nothing here"},
      {{"--from", "2V"}, "--from: "},
      {{"--trials", "9"}, "--trials: '9' is below 10"},
      {{"--trials", "5001"}, "--trials: '5001' is above 5000"},
      {{"--trials", "1e3"}, "--trials: '1e3' is not a whole number"},
      {{"--trials", "-1"}, "--trials: '-1' is not a whole number"},
      {{"--trials", "99999999999999999999"}, "--trials: '99999999999999999999' is not a whole number"},
      {{"--how", "ill"}, "--how: 'ill' is none of its choices -> choose fast or well"},
  };
  for (const BadValue& row : table) EXPECT_THAT(trouble(row.words), HasSubstr(row.expected));
}

// Any mixture of words is either read or refused in words, and nothing else happens.
TEST(CommandLine, SurvivesAnyMixtureOfWords) {
  const Command command = made_up();
  const std::vector<std::string> words = {"--capacitor",
                                          "--from",
                                          "--json",
                                          "-o",
                                          "--",
                                          "-",
                                          "",
                                          "10nF",
                                          "±",
                                          "--how=well",
                                          "--how",
                                          "--help",
                                          "-5us",
                                          "[a,b]",
                                          "--name=",
                                          "=",
                                          "---",
                                          "--=",
                                          "-o=",
                                          "-ox",
                                          "a.csv",
                                          "\xff\xfe",
                                          "--capacitor=1n±1%",
                                          "1e999",
                                          "-h",
                                          "--json=1",
                                          "++",
                                          "/x:1",
                                          "{}",
                                          std::string(5000, 'x')};
  Random random(20260304);
  std::size_t read = 0;
  for (int round = 0; round < 3000; ++round) {
    std::vector<std::string> line;
    for (std::uint64_t n = random.below(6); n > 0; --n) line.push_back(words[random.below(words.size())]);
    const Result<Arguments> arguments = read_arguments(command, line);
    if (arguments) ++read;
    if (arguments) continue;
    EXPECT_FALSE(arguments.error().place.empty()) << testing::PrintToString(line);
    EXPECT_FALSE(arguments.error().finding.empty()) << testing::PrintToString(line);
    EXPECT_LT(arguments.error().finding.size(), 400u) << testing::PrintToString(line);
  }
  EXPECT_GT(read, 300u);  // the mixture is not all nonsense
}

TEST(Arguments, ShowsOutsideTextSafely) {
  EXPECT_THAT(trouble({"--how", "\x1b[31m"}), HasSubstr("'\\x1b[31m'"));
}

TEST(Arguments, KnowsWhichOptionsNobodyAskedFor) {
  const Command command = made_up();
  const auto read = read_arguments(command, {});
  ASSERT_TRUE(read);
  (void)read->plain("--from");
  const auto left = read->never_asked();
  EXPECT_THAT(left, testing::Contains("--name"));
  EXPECT_THAT(left, testing::Not(testing::Contains("--from")));
}

}  // namespace
}  // namespace coilassay

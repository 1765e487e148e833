#include "app/commands/program.h"

#include <gtest/gtest.h>

#include <nlohmann/json.hpp>
#include <ostream>
#include <streambuf>

#include "app/commands/measuring.h"
#include "app/runs/version.h"
#include "tests/app/fake_console.h"

namespace coilassay::test {
namespace {

TEST(Program, SaysItsVersion) {
  const Ended ended = run({"--version"});
  EXPECT_EQ(ended.code, 0);
  EXPECT_EQ(ended.out, program_name() + "\n");
  EXPECT_TRUE(ended.out.starts_with("coilassay "));
}

TEST(Program, GivesAnOverviewWhenAskedForNothing) {
  const Ended ended = run({});
  EXPECT_EQ(ended.code, 2);
  EXPECT_EQ(ended.out, "");
  EXPECT_TRUE(contains(ended.error, "ringdown"));
}

struct Mistyped {
  std::vector<std::string> words;
  std::string expected;
};

TEST(Program, SaysWhatIsWrongWithACommandLine) {
  const std::vector<Mistyped> table = {
      {{"ringdwn"}, "ringdwn: there is no such command\n  try: did you mean coilassay ringdown?"},
      {{"simulte"}, "did you mean coilassay simulate?"},
      {{"simulate", "ringdwn"},
       "simulate ringdwn: there is no such command\n  try: did you mean coilassay simulate ringdown?"},
      {{"simulate"}, "coilassay simulate: it does not say what to simulate\n  try: coilassay simulate ringdown"},
      {{"zzzzzzzzzzzzzz"}, "try: coilassay help shows all commands"},
      {{"--verbose", "ringdown"}, "--verbose: the command comes first"},
      {{"ringdown"}, "coilassay ringdown: no FILE is given"},
      {{"help", "ringdwn"}, "did you mean coilassay ringdown?"},
      {{"completion", "fish"}, "completion is made for bash only"},
      {{"simulate", "ringdown"}, "-o: it is not said where the capture goes"},
      {{"simulate", "ringdown", "-o", "x", "--truth", "x"}, "--truth: this is the file of -o as well"},
      {{"ringdown", "a.csv", "--trials", "5000"}, "--trials: there are no trials it could apply to"},
      {{"ringdown", "a.csv", "--seed", "5"}, "--seed: there are no trials it could apply to"},
      {{"ringdown", "a.csv", "--figure", "a.png"}, "--figure: a figure is written as SVG"},
      {{"ringdown", "a.csv", "--report", "a.doc"}, "--report: a report is a page or a PDF"},
      {{"ringdown", "a.csv", "--from", "2us", "--to", "1us"}, "--to: the window ends before it begins"},
      {{"ringdown", "a.csv", "--delimiter", "5"}, "--delimiter: '5' cannot be that sign"},
      {{"ringdown", "a.csv", "--delimiter", ",", "--decimal", ","}, "the decimal sign and the delimiter are the same"},
      {{"ringdown", "a.csv", "--timebase", "100%"}, "--timebase: '100%' is not below 1"},
      {{"ringdown", "a.csv", "--timebase", "0.001±0.0001"}, "--timebase: '0.001±0.0001' has a tolerance"},
      {{"ringdown", "a.csv", "--capacitor-dissipation", "2"}, "--capacitor-dissipation: '2' is not below 1"},
      {{"ringdown", "a.csv", "--capacitor-dissipation", "0.001"}, "--capacitor-dissipation: no capacitor is given"},
  };
  for (const Mistyped& row : table) {
    const Ended ended = run(row.words);
    EXPECT_EQ(ended.code, 2) << row.expected;
    EXPECT_EQ(ended.out, "") << row.expected;
    EXPECT_TRUE(contains(ended.error, row.expected)) << ended.error << "\ninstead of " << row.expected;
  }
}

TEST(Program, GivesOneErrorDocumentWhenProgramsRead) {
  for (const auto& words : std::vector<std::vector<std::string>>{{"ringdown", "--json"},
                                                                 {"ringdwn", "x", "--json"},
                                                                 {"ringdown", "--capactor", "1n", "--json"},
                                                                 {"ringdown", "/no/such/file.csv", "--json"}}) {
    const Ended ended = run(words);
    EXPECT_EQ(ended.code, 2);
    EXPECT_EQ(ended.error, "");
    const auto document = nlohmann::json::parse(ended.out);
    EXPECT_EQ(document.at("schema"), "coilassay.error/1");
  }
}

TEST(Program, MapsFailuresToExitCodes) {
  EXPECT_EQ(exit_code_of(Problem::usage), ExitCode::unusable);
  EXPECT_EQ(exit_code_of(Problem::unreadable), ExitCode::unusable);
  EXPECT_EQ(exit_code_of(Problem::cannot_write), ExitCode::unusable);
  EXPECT_EQ(exit_code_of(Problem::instrument), ExitCode::broken);
  EXPECT_EQ(exit_code_of(Problem::ledger), ExitCode::broken);
}

/// Takes nothing and fails with a reason when it is flushed.
class FullDisk : public std::streambuf {
 public:
  explicit FullDisk(int reason) : reason_(reason) {}

 protected:
  int_type overflow(int_type c) override { return traits_type::not_eof(c); }
  int sync() override {
    errno = reason_;
    return -1;
  }

 private:
  int reason_;
};

TEST(Program, NoticesOutputThatDidNotArrive) {
  FullDisk disk(ENOSPC);
  std::ostream out(&disk);
  std::ostringstream error;
  Console console(out, error, {}, [] { return UtcTime{}; });
  EXPECT_EQ(run_program({"--version"}, console), 2);
  EXPECT_TRUE(contains(error.str(), "standard output: not all of the result could be written: No space left on device"))
      << error.str();
}

TEST(Program, IsQuietWhenItsReaderWentAway) {
  FullDisk disk(EPIPE);
  std::ostream out(&disk);
  std::ostringstream error;
  Console console(out, error, {}, [] { return UtcTime{}; });
  EXPECT_EQ(run_program({"--version"}, console), 0);
  EXPECT_EQ(error.str(), "");
}

TEST(Program, ColoursOnlyATerminalThatWantsIt) {
  const Surroundings terminal = {.script = Script::utf8, .out_is_terminal = true, .error_is_terminal = true};
  Surroundings plain = terminal;
  plain.no_color = true;
  EXPECT_TRUE(contains(run({"help", "ringdown"}, terminal).out, "\x1b["));
  EXPECT_FALSE(contains(run({"help", "ringdown"}, plain).out, "\x1b["));
  EXPECT_FALSE(contains(run({"help", "ringdown", "--color", "never"}, terminal).out, "\x1b["));
  EXPECT_FALSE(contains(run({"help", "ringdown", "--color", "auto"}).out, "\x1b["));
}

TEST(Console, TakesTheScriptFromTheFirstLocaleThatIsSet) {
  EXPECT_EQ(script_of_locale("", "", "en_GB.UTF-8"), Script::utf8);
  EXPECT_EQ(script_of_locale("", "", "de_DE.utf8"), Script::utf8);
  EXPECT_EQ(script_of_locale("C", "en_GB.UTF-8", "en_GB.UTF-8"), Script::ascii);
  EXPECT_EQ(script_of_locale("", "POSIX", "en_GB.UTF-8"), Script::ascii);
  EXPECT_EQ(script_of_locale("", "C.UTF-8", "C"), Script::utf8);
  EXPECT_EQ(script_of_locale("", "", ""), Script::ascii);
  EXPECT_EQ(script_of_locale("", "", "de_DE.ISO-8859-1"), Script::ascii);
}

}  // namespace
}  // namespace coilassay::test

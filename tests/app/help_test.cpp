#include <gtest/gtest.h>
#include <unistd.h>

#include <cstdio>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "app/commands/command_list.h"
#include "app/commands/help_text.h"
#include "app/commands/reference.h"
#include "report/text_layout.h"
#include "tests/app/fake_console.h"
#include "tests/support/paths.h"

namespace coilassay::test {
namespace {

bool is_ascii(const std::string& text) {
  return std::all_of(text.begin(), text.end(), [](char c) { return static_cast<unsigned char>(c) < 0x80; });
}

TEST(Help, MentionsEveryOptionWithItsMeaning) {
  for (const Command& command : commands()) {
    const std::string page = help_page(command, {.script = Script::utf8, .width = 400});
    for (const OptionGroup& group : command.groups) {
      EXPECT_TRUE(contains(page, '\n' + std::string(group.title) + '\n'));
      for (const Option& option : group.options) {
        EXPECT_TRUE(contains(page, "  " + usage_of(option))) << option.name;
        EXPECT_TRUE(contains(page, option.help)) << option.name;
      }
    }
    for (const Example& example : command.examples) EXPECT_TRUE(contains(page, example.line)) << example.line;
  }
}

TEST(Help, FitsTheTerminal) {
  for (const Command& command : commands()) {
    std::istringstream page(help_page(command, {.script = Script::utf8, .width = 80}));
    for (std::string line; std::getline(page, line);) EXPECT_LE(display_width(line), 80u) << line;
  }
}

TEST(Help, IsPlainAsciiWhereUtf8IsNotKnown) {
  for (const Command& command : commands()) {
    EXPECT_TRUE(is_ascii(help_page(command, {.script = Script::ascii, .width = 80}))) << command.name;
  }
  EXPECT_TRUE(is_ascii(overview(commands(), {.script = Script::ascii, .width = 80})));
}

TEST(Help, IsReachedInEveryUsualWay) {
  const std::string page = run({"help", "ringdown"}).out;
  EXPECT_TRUE(contains(page, "--capacitor VALUE"));
  EXPECT_EQ(run({"ringdown", "--help"}).out, page);
  EXPECT_EQ(run({"ringdown", "-h"}).out, page);
  EXPECT_EQ(run({"ringdown", "x.csv", "--json", "--help"}).out, page);
  EXPECT_EQ(run({"help", "simulate", "ringdown"}).out, run({"simulate", "ringdown", "--help"}).out);
  EXPECT_EQ(run({"--help"}).out, run({"help"}).out);
  EXPECT_EQ(run({"-h"}).code, 0);
}

TEST(Help, OfAFamilyNamesItsMembers) {
  const std::string family = run({"help", "simulate"}).out;
  for (const char* member : {"simulate ringdown", "simulate resistance", "simulate ramp", "simulate sine"}) {
    EXPECT_NE(family.find(member), std::string::npos) << member;
  }
  EXPECT_EQ(run({"simulate", "--help"}).code, 0);
}

TEST(Reference, MentionsEveryOption) {
  const std::string man = man_page(commands(), "1.2.3");
  const std::string markdown = markdown_reference(commands());
  const std::string bash = bash_completion(commands());
  for (const Command& command : commands()) {
    for (const OptionGroup& group : command.groups) {
      for (const Option& option : group.options) {
        std::string in_roff(option.name);
        for (std::size_t at = 0; (at = in_roff.find('-', at)) != std::string::npos; at += 2) in_roff.insert(at, "\\");
        EXPECT_TRUE(contains(man, "\\fB" + in_roff + "\\fR")) << option.name;
        EXPECT_TRUE(contains(markdown, "`" + std::string(option.name))) << option.name;
        EXPECT_TRUE(contains(bash, option.name)) << option.name;
      }
    }
  }
  EXPECT_TRUE(is_ascii(man));
  EXPECT_TRUE(contains(man, "coilassay 1.2.3"));
}

TEST(Reference, InDocsIsCurrent) {
  std::ifstream file(project_file("docs/commands.md"));
  std::ostringstream text;
  text << file.rdbuf();
  EXPECT_EQ(text.str(), markdown_reference(commands()))
      << "write it anew: coilassay help --markdown > docs/commands.md";
}

/// What bash offers after these words, the last of which is being typed.
std::string completed(const std::vector<std::string>& words) {
  const std::string script = testing::TempDir() + "coilassay_completion_" + std::to_string(::getpid()) + ".bash";
  std::ofstream(script) << bash_completion(commands());
  std::string line =
      "bash --norc -c 'source \"$0\"; COMP_WORDS=(\"$@\"); COMP_CWORD=$(($# - 1)); _coilassay; "
      "printf \"%s\\n\" \"${COMPREPLY[@]}\"' '" +
      script + "'";
  for (const std::string& word : words) line += " '" + word + "'";
  FILE* pipe = popen(line.c_str(), "r");
  std::string out;
  for (int c = 0; pipe != nullptr && (c = fgetc(pipe)) != EOF;) out += static_cast<char>(c);
  if (pipe != nullptr) pclose(pipe);
  std::filesystem::remove(script);
  return out;
}

TEST(Completion, OffersCommandsOptionsAndChoicesInBash) {
  EXPECT_EQ(completed({"coilassay", "ring"}), "ringdown\n");
  EXPECT_EQ(completed({"coilassay", "simulate", ""}), "burst\ncoupled\ninstrument\nramp\nresistance\nringdown\nsine\nsweep\n");
  EXPECT_EQ(completed({"coilassay", "ringdown", "--capacitor-"}), "--capacitor-dissipation\n");
  EXPECT_EQ(completed({"coilassay", "ringdown", "x.csv", "--propagate", ""}), "first-order\ntrials\n");
  EXPECT_EQ(completed({"coilassay", "simulate", "ringdown", "--transient-"}), "--transient-time\n");
  EXPECT_EQ(completed({"coilassay", "ringdown", "--figure", "LICEN"}), completed({"coilassay", "ringdown", "LICEN"}));
  EXPECT_EQ(completed({"coilassay", "ringdown", "app/main"}), "app/main.cpp\n");
  EXPECT_EQ(completed({"coilassay", "ringdown", "--capacitor", ""}), "\n");
}

}  // namespace
}  // namespace coilassay::test

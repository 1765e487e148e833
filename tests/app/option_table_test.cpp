#include <gtest/gtest.h>

#include <set>

#include "app/commands/arguments.h"
#include "app/commands/command_list.h"
#include "app/runs/simulate_run.h"
#include "base/number_text.h"
#include "report/text_layout.h"

namespace coilassay {
namespace {

template <class Check>
void for_each_option(Check check) {
  for (const Command& command : commands()) {
    for (const OptionGroup& group : command.groups) {
      for (const Option& option : group.options) {
        SCOPED_TRACE(std::string(command.name) + " " + std::string(option.name));
        check(command, option);
      }
    }
  }
}

TEST(OptionTable, NamesEachOptionOfACommandOnce) {
  for (const Command& command : commands()) {
    std::set<std::string_view> seen;
    for (const OptionGroup& group : command.groups) {
      EXPECT_FALSE(group.title.empty()) << command.name;
      for (const Option& option : group.options) EXPECT_TRUE(seen.insert(option.name).second) << option.name;
    }
  }
}

TEST(OptionTable, KnowsOfEachFileWhetherItIsWritten) {
  const std::set<std::string_view> read = {"--bench", "--fixture", "--folder", "--instrument", "--load", "--matrix", "--open", "--part-sheet", "--remove-port1",
                                           "--remove-port2", "--saturation", "--sheet", "--short"};
  for_each_option([&](const Command&, const Option& option) {
    if (option.kind == ValueKind::file) {
      EXPECT_NE(is_written(option), read.contains(option.name));
    }
  });
}

TEST(OptionTable, SaysOfEachOptionWhatItIs) {
  for_each_option([](const Command&, const Option& option) {
    EXPECT_TRUE(option.name == "-o" || option.name.starts_with("--"));
    EXPECT_FALSE(option.help.empty());
    EXPECT_FALSE(option.help.ends_with('.'));
    EXPECT_EQ(option.kind == ValueKind::flag, option.value_name.empty());
    EXPECT_EQ(option.kind == ValueKind::choice, !option.choices.empty());
    EXPECT_EQ(option.kind == ValueKind::flag, option.example.empty());
  });
}

TEST(OptionTable, ShowsExamplesThatAreAccepted) {
  for_each_option([](const Command& command, const Option& option) {
    if (option.kind == ValueKind::flag) return;
    Arguments arguments(command);
    const Result<void> added = arguments.add(option, std::string(option.example));
    EXPECT_TRUE(added) << (added ? "" : added.error().finding);
    // Where text is plain ASCII, the example is shown in ASCII, and must be accepted like that too.
    Arguments plain(command);
    EXPECT_TRUE(plain.add(option, in_script(option.example, Script::ascii)));
  });
}

TEST(OptionTable, ShowsExamplesOfCommandsThatParse) {
  for (const Command& command : commands()) {
    EXPECT_FALSE(command.examples.empty()) << command.name;
    for (const Example& example : command.examples) {
      SCOPED_TRACE(example.line);
      EXPECT_LE(display_width(example.line), 68u) << "does not fit on a line of a terminal";
      ASSERT_TRUE(example.line.starts_with(command.name));
      std::vector<std::string> words;
      std::string word;
      for (const char c : std::string(example.line.substr(command.name.size())) + " ") {
        if (c != ' ') {
          word += c;
        } else if (!word.empty()) {
          words.push_back(std::exchange(word, ""));
        }
      }
      if (const auto bar = std::find(words.begin(), words.end(), "|"); bar != words.end())
        words.erase(bar, words.end());
      const Result<Arguments> read = read_arguments(command, words);
      EXPECT_TRUE(read) << (read ? "" : read.error().place + ": " + read.error().finding);
    }
  }
}

TEST(OptionTable, HasSummariesThatFitTheOverview) {
  for (const Command& command : commands()) EXPECT_LE(display_width(command.summary), 59u) << command.name;
}

TEST(OptionTable, GivesEveryParameterOfTheSimulatedBenchAnOption) {
  const Command* simulate = find_command("simulate ringdown");
  ASSERT_NE(simulate, nullptr);
  for (const RingDownParameter& parameter : ring_down_parameters()) {
    std::string name = "--" + std::string(parameter.name);
    std::replace(name.begin(), name.end(), '_', '-');
    const Option* option = simulate->find(name);
    ASSERT_NE(option, nullptr) << name;
    EXPECT_EQ(option->unit, parameter.unit) << name;
  }
}

// "inductance, 47 µH unless given": what the help says must be what the bench takes.
TEST(OptionTable, StatesTheDefaultsOfTheSimulatedBench) {
  const Command* simulate = find_command("simulate ringdown");
  const synthetic::RingDownBench defaults;
  for (const RingDownParameter& parameter : ring_down_parameters()) {
    if (defaults.*parameter.member == 0) continue;
    std::string name = "--" + std::string(parameter.name);
    std::replace(name.begin(), name.end(), '_', '-');
    const std::string_view help = simulate->find(name)->help;
    const std::size_t end = help.find(" unless given");
    ASSERT_NE(end, std::string_view::npos) << name;
    const std::size_t begin = help.rfind(", ", end) + 2;
    const auto stated = parse_value(help.substr(begin, end - begin), parameter.unit, name);
    ASSERT_TRUE(stated) << name << ": " << stated.error().finding;
    EXPECT_EQ(stated->value, defaults.*parameter.member) << name;
  }
}

TEST(OptionTable, NamesSimulatedThingsLikeMeasuredOnes) {
  const Command* measure = find_command("ringdown");
  const Command* simulate = find_command("simulate ringdown");
  for (const char* name : {"--capacitor", "--capacitor-dissipation", "--probe-capacitance", "--probe-resistance",
                           "--across", "--across-capacitance", "--timebase"}) {
    ASSERT_NE(measure->find(name), nullptr) << name;
    ASSERT_NE(simulate->find(name), nullptr) << name;
    EXPECT_EQ(measure->find(name)->unit, simulate->find(name)->unit) << name;
  }
}

}  // namespace
}  // namespace coilassay

// The only file that includes CLI11; compiled without optimisation, which would cost half a minute here.
#include "app/commands/command_line.h"

#include <CLI/CLI.hpp>
#include <algorithm>
#include <span>

#include "base/outside_text.h"

namespace coilassay {

namespace {

std::vector<std::string_view> names_of(const Command& command) {
  std::vector<std::string_view> names;
  for (const OptionGroup& group : command.groups) {
    for (const Option& option : group.options) names.push_back(option.name);
  }
  return names;
}

tl::unexpected<Error> no_such_option(const Command& command, const std::string& word) {
  const std::string_view typed = std::string_view(word).substr(0, word.find('='));
  const std::vector<std::string_view> names = names_of(command);
  // A beginning of a name is nearer than any misspelling.
  std::string_view hint;
  for (const std::string_view name : names) {
    if (hint.empty() && typed.size() > 3 && name.starts_with(typed)) hint = name;
  }
  if (hint.empty()) hint = nearest(typed, names);
  const std::string help = "coilassay help " + std::string(command.name) + " lists its options";
  return failure(Problem::usage, std::string(typed), std::string(command.name) + " has no such option",
                 hint.empty() ? help : "did you mean " + std::string(hint) + "? " + help);
}

tl::unexpected<Error> no_value(const Option& option) {
  return failure(Problem::usage, std::string(option.name), "the option has no value", how_to_write(option));
}

/// The words up to "--", ready for CLI11: every value stands behind its option, and whatever CLI11 would take or refuse
/// in its own words is settled.
Result<std::vector<std::string>> checked(const Command& command, std::span<const std::string> words) {
  std::vector<std::string> result;
  const Option* waiting = nullptr;  // takes the next word, whatever it looks like
  for (const std::string& word : words) {
    if (waiting != nullptr) {
      if (command.find(word) != nullptr) return no_value(*waiting);
      waiting = nullptr;
      result.push_back(word);
      continue;
    }
    const bool is_word = word.size() < 2 || word.front() != '-';
    const bool is_short = !is_word && word[1] != '-';
    const std::size_t equals = word.find('=');
    const std::size_t name_ends = is_short ? 2 : std::min(equals, word.size());
    const Option* option = is_word ? nullptr : command.find(word.substr(0, name_ends));
    if (!is_word && option == nullptr) return no_such_option(command, word);
    if (option == nullptr || name_ends == word.size()) {
      if (option != nullptr && option->kind != ValueKind::flag) waiting = option;
      result.push_back(word);
    } else if (option->kind == ValueKind::flag) {
      return failure(Problem::usage, std::string(option->name), "the option takes no value",
                     "write " + std::string(option->name) + " alone");
    } else {
      result.emplace_back(option->name);
      result.push_back(word.substr(equals == name_ends ? name_ends + 1 : name_ends));
    }
  }
  if (waiting != nullptr) return no_value(*waiting);
  return result;
}

}  // namespace

Result<SplitLine> split_command_line(const Command& command, const std::vector<std::string>& words) {
  const auto end = std::find(words.begin(), words.end(), "--");
  Result<std::vector<std::string>> given = checked(command, std::span(words.begin(), end));
  if (!given) return failure(given);

  CLI::App app;
  app.set_help_flag();  // ours is in the table
  std::vector<std::pair<const Option*, CLI::Option*>> declared;
  for (const OptionGroup& group : command.groups) {
    for (const Option& option : group.options) {
      const std::string name(option.name);
      declared.emplace_back(&option,
                            option.kind == ValueKind::flag ? app.add_flag(name) : app.add_option(name)->take_all());
    }
  }
  SplitLine line;
  app.allow_extras();  // the words; declared as an option, a name in square brackets would be taken for a list
  try {
    std::reverse(given->begin(), given->end());  // CLI11 takes them from the end
    app.parse(std::move(*given));
  } catch (const CLI::Error& error) {
    return failure(Problem::usage, "coilassay " + std::string(command.name), error.what(), usage_of(command));
  }
  line.words = app.remaining();
  for (const auto& [option, seen] : declared) {
    if (option->kind == ValueKind::flag) {
      if (seen->count() > 0) line.options.emplace_back(option, "");
    } else {
      for (const std::string& text : seen->results()) line.options.emplace_back(option, text);
    }
  }
  if (end != words.end()) line.words.insert(line.words.end(), end + 1, words.end());
  return line;
}

}  // namespace coilassay

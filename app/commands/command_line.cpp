// The only file that includes CLI11; compiled without optimisation, which would cost half a minute here.
#include "app/commands/command_line.h"

#include <CLI/CLI.hpp>
#include <algorithm>

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
    if (typed.size() > 3 && name.starts_with(typed)) hint = name;
  }
  if (hint.empty()) hint = nearest(typed, names);
  const std::string help = "coilassay help " + std::string(command.name) + " lists its options";
  return failure(Problem::usage, std::string(typed), std::string(command.name) + " has no such option",
                 hint.empty() ? help : "did you mean " + std::string(hint) + "? " + help);
}

tl::unexpected<Error> no_value(const Option& option) {
  return failure(Problem::usage, std::string(option.name), "the option has no value", how_to_write(option));
}

/// What CLI11 would take in its own way is settled first: a value that is left out or empty, a flag with a value.
Result<std::vector<std::string>> checked(const Command& command, const std::vector<std::string>& words) {
  std::vector<std::string> result;
  const Option* waiting = nullptr;  // takes the next word, whatever it looks like
  bool options_ended = false;
  for (const std::string& word : words) {
    const Option* waited = std::exchange(waiting, nullptr);
    if (waited != nullptr) {
      if (word == "--" || command.find(word) != nullptr) {
        return no_value(*waited);
      }
      result.push_back(word);
      continue;
    }
    options_ended = options_ended || word == "--";
    const std::size_t equals = word.find('=');
    const Option* option = options_ended ? nullptr : command.find(word.substr(0, equals));
    if (option == nullptr) {
      result.push_back(word);
    } else if (equals == std::string::npos) {
      if (option->kind != ValueKind::flag) waiting = option;
      result.push_back(word);
    } else if (option->kind == ValueKind::flag) {
      return failure(Problem::usage, std::string(option->name), "the option takes no value",
                     "write " + std::string(option->name) + " alone");
    } else {
      result.emplace_back(option->name);
      result.push_back(word.substr(equals + 1));
    }
  }
  if (waiting != nullptr) return no_value(*waiting);
  return result;
}

}  // namespace

Result<SplitLine> split_command_line(const Command& command, const std::vector<std::string>& words) {
  Result<std::vector<std::string>> given = checked(command, words);
  if (!given) return failure(given);

  CLI::App app;
  app.set_help_flag();  // ours is in the table
  app.allow_extras();
  std::vector<std::pair<const Option*, CLI::Option*>> declared;
  for (const OptionGroup& group : command.groups) {
    for (const Option& option : group.options) {
      const std::string name(option.name);
      declared.emplace_back(&option, option.kind == ValueKind::flag ? app.add_flag(name) : app.add_option(name)->take_all());
    }
  }
  SplitLine line;
  app.add_option("words", line.words);
  try {
    std::reverse(given->begin(), given->end());  // CLI11 takes them from the end
    app.parse(std::move(*given));
  } catch (const CLI::Error& error) {
    return failure(Problem::usage, "coilassay " + std::string(command.name), error.what(), usage_of(command));
  }
  for (const std::string& extra : app.remaining()) {
    if (extra.size() > 1 && extra.front() == '-') return no_such_option(command, extra);
    return failure(Problem::usage, "coilassay " + std::string(command.name), "there is no use for " + in_quotes(extra),
                   usage_of(command));
  }
  for (const auto& [option, seen] : declared) {
    if (option->kind == ValueKind::flag) {
      if (seen->count() > 0) line.options.emplace_back(option, "");
    } else {
      for (const std::string& text : seen->results()) line.options.emplace_back(option, text);
    }
  }
  return line;
}

}  // namespace coilassay

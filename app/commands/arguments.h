// A command line as the command sees it: every value read, checked and named.
#pragma once

#include <cstdint>
#include <map>
#include <optional>
#include <set>
#include <string>
#include <string_view>
#include <vector>

#include "app/commands/option_table.h"
#include "app/runs/spared_files.h"
#include "base/quantity.h"
#include "base/result.h"

namespace coilassay {

/// Options by name. Asking for one that the command does not declare, or as another kind, is a programming mistake.
class Arguments {
 public:
  struct Value {
    std::string text;
    StatedValue stated;
    std::uint64_t count = 0;
  };

  explicit Arguments(const Command& command) : command_(&command) {}

  /// Reads one value; bad_number, wrong_unit or usage, with the option's name as the place.
  Result<void> add(const Option& option, const std::string& text);
  void add_word(std::string word) { words_.push_back(std::move(word)); }

  const Command& command() const { return *command_; }
  const std::vector<std::string>& words() const { return words_; }

  bool has(std::string_view option) const;
  std::optional<StatedValue> stated(std::string_view option) const;
  std::vector<StatedValue> all_stated(std::string_view option) const;
  std::vector<std::string> all_texts(std::string_view option) const;
  std::optional<double> plain(std::string_view option) const;
  std::vector<double> all_plain(std::string_view option) const;
  std::optional<std::uint64_t> count(std::string_view option) const;
  /// Of a text, a file or a choice.
  std::optional<std::string> text(std::string_view option) const;
  std::vector<std::string> all_text(std::string_view option) const;

  /// Every file on the command line; a text counts, as it may name one (--primary-open).
  struct Files {
    std::vector<GivenFile> read, written;
  };
  Files files() const;

  /// Declared options that nobody has asked for yet: an option that does nothing shows up here.
  std::vector<std::string_view> never_asked() const;

 private:
  const std::vector<Value>& values(std::string_view option, std::initializer_list<ValueKind> kinds) const;

  const Command* command_;
  std::vector<std::string> words_;
  std::map<std::string_view, std::vector<Value>> values_;
  mutable std::set<std::string_view> asked_;
};

/// Whether the file of this option is written, or added to.
bool is_written(const Option& option);

/// Splits and reads what follows the command's name.
Result<Arguments> read_arguments(const Command& command, const std::vector<std::string>& words);

}  // namespace coilassay

#include "app/commands/arguments.h"

#include <algorithm>
#include <cassert>
#include <charconv>
#include <cmath>

#include "app/commands/command_line.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

std::string place_of(const Option& option) {
  return std::string(option.name);
}

/// What is wrong with a value or its tolerance, to stand after the value; empty when nothing is.
std::string out_of_range(const StatedValue& stated, const Option& option) {
  const double value = stated.value;
  if (!(value < option.below)) return " is not below " + to_text(option.below, option.unit, Script::utf8, 3);
  const double half = stated.law == Law::rectangular ? stated.half_width
                      : stated.law == Law::normal    ? stated.standard_uncertainty
                                                     : 0;
  switch (option.range) {
    case Range::any: return "";
    case Range::not_zero:
      if (value == 0) return " is zero";
      return half >= std::fabs(value) ? " has a tolerance as large as the value" : "";
    case Range::not_negative:
      if (value < 0) return " is below zero";
      return half > value ? " has a tolerance that reaches below zero" : "";
    case Range::positive:
      if (!(value > 0)) return " is not above zero";
      return half >= value ? " has a tolerance that reaches down to zero" : "";
    case Range::above_absolute_zero: return value < -273.15 ? " is below absolute zero" : "";
  }
  return "";
}

Result<StatedValue> read_stated(const Option& option, const std::string& text) {
  Result<StatedValue> value = parse_value(text, option.unit, option.name);
  if (!value) {
    Error error = value.error();
    if (error.problem == Problem::wrong_unit) error.remedy = how_to_write(option);  // nearer than one for any unit
    return tl::make_unexpected(std::move(error));
  }
  if (const std::string finding = out_of_range(*value, option); !finding.empty()) {
    return failure(Problem::bad_number, place_of(option), in_quotes(text) + finding, how_to_write(option));
  }
  if (option.kind == ValueKind::plain && value->law != Law::unstated) {
    return failure(Problem::bad_number, place_of(option),
                   in_quotes(text) + " has a tolerance, which means nothing here", "give the value alone");
  }
  return value;
}

Result<std::uint64_t> read_count(const Option& option, const std::string& text) {
  std::uint64_t count = 0;
  const auto [end, trouble] = std::from_chars(text.data(), text.data() + text.size(), count);
  if (trouble != std::errc{} || end != text.data() + text.size()) {
    return failure(Problem::bad_number, place_of(option), in_quotes(text) + " is not a whole number",
                   how_to_write(option));
  }
  if (count < option.least || count > option.most) {
    const bool low = count < option.least;
    return failure(
        Problem::bad_number, place_of(option),
        in_quotes(text) + (low ? " is below " : " is above ") + std::to_string(low ? option.least : option.most),
        how_to_write(option));
  }
  return count;
}

Result<void> check_choice(const Option& option, const std::string& text) {
  if (std::find(option.choices.begin(), option.choices.end(), text) != option.choices.end()) return {};
  std::string all;
  for (const std::string_view choice : option.choices) {
    if (!all.empty()) all += choice == option.choices.back() ? " or " : ", ";
    all += choice;
  }
  return failure(Problem::usage, place_of(option), in_quotes(text) + " is none of its choices", "choose " + all);
}

}  // namespace

Result<void> Arguments::add(const Option& option, const std::string& text) {
  std::vector<Value>& values = values_[option.name];
  if (!values.empty() && !option.repeatable) {
    if (option.kind == ValueKind::flag) return {};
    return failure(Problem::usage, place_of(option), "the option is given twice", "give it once");
  }
  Value value;
  value.text = text;
  switch (option.kind) {
    case ValueKind::flag: break;
    case ValueKind::stated:
    case ValueKind::plain: {
      Result<StatedValue> stated = read_stated(option, text);
      if (!stated) return failure(stated);
      value.stated = *stated;
      break;
    }
    case ValueKind::count: {
      const Result<std::uint64_t> count = read_count(option, text);
      if (!count) return failure(count);
      value.count = *count;
      break;
    }
    case ValueKind::choice:
      if (const Result<void> fine = check_choice(option, text); !fine) return fine;
      break;
    case ValueKind::text:
    case ValueKind::file:
      if (text.empty()) {
        return failure(Problem::usage, place_of(option), "the value is empty",
                       "give a " + std::string(option.value_name));
      }
  }
  values.push_back(std::move(value));
  return {};
}

const std::vector<Arguments::Value>& Arguments::values(std::string_view option,
                                                       std::initializer_list<ValueKind> kinds) const {
  static const std::vector<Value> none;
  const Option* declared = command_->find(option);
  assert(declared != nullptr && "a command asks only for options it declares");
  assert(std::find(kinds.begin(), kinds.end(), declared->kind) != kinds.end());
  asked_.insert(declared->name);  // not the caller's text, which may be gone before this
  const auto found = values_.find(option);
  return found == values_.end() ? none : found->second;
}

bool Arguments::has(std::string_view option) const {
  return !values(option, {ValueKind::flag, ValueKind::stated, ValueKind::plain, ValueKind::count, ValueKind::choice,
                          ValueKind::text, ValueKind::file})
              .empty();
}

std::optional<StatedValue> Arguments::stated(std::string_view option) const {
  const std::vector<Value>& all = values(option, {ValueKind::stated});
  return all.empty() ? std::nullopt : std::optional(all.front().stated);
}

std::vector<StatedValue> Arguments::all_stated(std::string_view option) const {
  std::vector<StatedValue> result;
  for (const Value& value : values(option, {ValueKind::stated})) result.push_back(value.stated);
  return result;
}

std::vector<std::string> Arguments::all_texts(std::string_view option) const {
  std::vector<std::string> result;
  for (const Value& value : values(option, {ValueKind::text, ValueKind::file, ValueKind::choice})) result.push_back(value.text);
  return result;
}

std::optional<double> Arguments::plain(std::string_view option) const {
  const std::vector<Value>& all = values(option, {ValueKind::plain});
  return all.empty() ? std::nullopt : std::optional(all.front().stated.value);
}

std::vector<double> Arguments::all_plain(std::string_view option) const {
  std::vector<double> result;
  for (const Value& value : values(option, {ValueKind::plain})) result.push_back(value.stated.value);
  return result;
}

std::optional<std::uint64_t> Arguments::count(std::string_view option) const {
  const std::vector<Value>& all = values(option, {ValueKind::count});
  return all.empty() ? std::nullopt : std::optional(all.front().count);
}

std::optional<std::string> Arguments::text(std::string_view option) const {
  const std::vector<Value>& all = values(option, {ValueKind::text, ValueKind::file, ValueKind::choice});
  return all.empty() ? std::nullopt : std::optional(all.front().text);
}

std::vector<std::string> Arguments::all_text(std::string_view option) const {
  std::vector<std::string> result;
  for (const Value& value : values(option, {ValueKind::text, ValueKind::file})) result.push_back(value.text);
  return result;
}

bool is_written(const Option& option) {
  constexpr std::string_view names[] = {"-o", "--bench-out", "--figure", "--ledger", "--netlist", "--report", "--touchstone", "--trace", "--truth"};
  return option.kind == ValueKind::file && std::find(std::begin(names), std::end(names), option.name) != std::end(names);
}

Arguments::Files Arguments::files() const {
  Files files;
  if (command_->positional.files) {
    for (const std::string& word : words_) files.read.push_back({"", word});
  }
  for (const OptionGroup& group : command_->groups) {
    for (const Option& option : group.options) {
      const auto found = values_.find(option.name);
      if (found == values_.end() || (option.kind != ValueKind::file && option.kind != ValueKind::text)) continue;
      for (const Value& value : found->second) {
        (is_written(option) ? files.written : files.read).push_back({std::string(option.name), value.text});
      }
    }
  }
  return files;
}

std::vector<std::string_view> Arguments::never_asked() const {
  std::vector<std::string_view> result;
  for (const OptionGroup& group : command_->groups) {
    for (const Option& option : group.options) {
      if (!asked_.contains(option.name)) result.push_back(option.name);
    }
  }
  return result;
}

Result<Arguments> read_arguments(const Command& command, const std::vector<std::string>& words) {
  Result<SplitLine> line = split_command_line(command, words);
  if (!line) return failure(line);
  Arguments arguments(command);
  for (const auto& [option, text] : line->options) {
    if (const Result<void> added = arguments.add(*option, text); !added) return failure(added);
  }
  for (std::string& word : line->words) arguments.add_word(std::move(word));
  // Help is for whoever does not know yet what must be given.
  if (command.find("--help") != nullptr && arguments.has("--help")) return arguments;

  const Positional& expected = command.positional;
  const std::size_t given = arguments.words().size();
  const std::string name = "coilassay " + std::string(command.name);
  if (given < expected.least) {
    const bool several = expected.name.find(' ') != std::string_view::npos;
    return failure(Problem::usage, name,
                   several ? "it needs " + std::string(expected.name) : "no " + std::string(expected.name) + " is given",
                   usage_of(command));
  }
  if (given > expected.most) {
    return failure(Problem::usage, name,
                   "there is no use for " + in_quotes(arguments.words()[expected.most]) +
                       (expected.most == 0 ? "" : ", one " + std::string(expected.name) + " is enough"),
                   usage_of(command));
  }
  return arguments;
}

}  // namespace coilassay

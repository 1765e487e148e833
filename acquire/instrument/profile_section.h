// One table of a profile, read key by key: for the files that read profiles only.
#pragma once

#include <chrono>
#include <map>
#include <optional>
#include <string>
#include <vector>

#include "acquire/instrument/profile.h"
#include "base/sheet.h"

namespace coilassay {

/// Keeps the first error and goes on asking, so that every key becomes known to the sheet.
class ProfileSection {
 public:
  ProfileSection(SheetTable table, std::string name, std::optional<Error>& error)
      : table_(std::move(table)), name_(std::move(name)), error_(&error) {}

  bool has(std::string_view key) const { return table_.has(key); }
  std::string place(std::string_view key) const { return table_.place(key); }
  void refuse(Problem problem, std::string_view key, std::string finding, std::string remedy);

  std::optional<std::string> text(std::string_view key) { return kept(table_.text(key)); }
  std::optional<std::chrono::year_month_day> date(std::string_view key) { return kept(table_.date(key)); }
  std::optional<bool> flag(std::string_view key) { return kept(table_.flag(key)); }
  std::vector<std::string> texts(std::string_view key);
  /// A list, or one text that stands for a list of one.
  std::vector<std::string> one_or_more(std::string_view key);
  std::optional<long long> integer(std::string_view key, long long least, long long most);
  std::optional<StatedValue> value(std::string_view key, Unit unit);
  std::optional<double> positive(std::string_view key, Unit unit);  // above zero, without a tolerance
  std::optional<double> not_negative(std::string_view key, Unit unit);
  /// One of some words; the first is returned when it is not said.
  std::string word(std::string_view key, const std::vector<std::string>& words);
  /// Text that is sent: not empty, one line, no control characters.
  std::optional<std::string> command(std::string_view key);
  void check_command(std::string_view key, const std::string& text);
  std::optional<ProfileSection> section(std::string_view key);
  std::vector<ProfileSection> sections(std::string_view key);

  /// "L_s [uH]", "status", "-".
  std::vector<ProfileField> fields(std::string_view key);
  StatedConditions conditions(std::string_view key);
  /// A table by the symbols of the fields: each asked with its unit.
  std::map<std::string, double> limits(std::string_view key, const std::vector<ProfileField>& fields, bool as_share);
  std::map<std::string, Accuracy> accuracies(std::string_view key, const std::vector<ProfileField>& fields);
  std::map<std::string, StatedValue> values(std::string_view key, const std::vector<ProfileField>& fields);
  std::string decimal_sign();
  std::string separator_sign();

 private:
  template <class T>
  std::optional<T> kept(Result<std::optional<T>> read) {
    if (read) return *read;
    if (!*error_) *error_ = read.error();
    return std::nullopt;
  }

  SheetTable table_;
  std::string name_;
  std::optional<Error>* error_;
};

}  // namespace coilassay

// One table of a part sheet as it is read: the first error is kept, and asking goes on so that every key becomes known.
#pragma once

#include <initializer_list>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "base/quantity.h"
#include "base/sheet.h"

namespace coilassay {

/// What a value must be to make sense.
enum class SheetRange { any, not_zero, above_zero, not_negative, fraction };  // fraction: above 0 and below 1

class SheetSection {
 public:
  SheetSection(SheetTable table, std::string name, std::optional<Error>& error)
      : table_(std::move(table)), name_(std::move(name)), error_(&error) {}

  bool has(std::string_view key) const { return table_.has(key); }
  std::vector<std::string> keys() const { return table_.keys(); }
  std::string place(std::string_view key) const { return table_.place(key); }
  /// The table's own line.
  std::string place() const { return table_.place(""); }
  std::string full(std::string_view key) const;

  void refuse(Problem problem, std::string_view key, std::string finding, std::string remedy);
  void note(const Error& error);

  /// A value of the first of the units that fits; a bare number is taken in the first one.
  std::optional<StatedValue> value(std::string_view key, std::initializer_list<Unit> units, SheetRange range);
  /// One value, or a list of texts; empty when the key is absent.
  std::vector<StatedValue> values(std::string_view key, Unit unit, SheetRange range);
  /// A value that is a number and no more: a tolerance with it is refused.
  std::optional<double> plain(std::string_view key, std::initializer_list<Unit> units, SheetRange range);
  std::optional<double> number(std::string_view key, SheetRange range);
  std::optional<std::uint64_t> count(std::string_view key, std::uint64_t least, std::uint64_t most);
  std::optional<bool> flag(std::string_view key);
  std::optional<std::chrono::year_month_day> date(std::string_view key);
  std::optional<std::string> text(std::string_view key);             // not empty
  std::vector<std::string> texts(std::string_view key);              // a list; empty when the key is absent
  std::optional<std::string> raw_text(std::string_view key) const;   // as it stands, when it is text at all
  std::optional<std::string> choice(std::string_view key, std::initializer_list<std::string_view> allowed);
  std::optional<SheetSection> section(std::string_view key);
  std::vector<SheetSection> sections(std::string_view key);

 private:
  bool fits(std::string_view key, const StatedValue& stated, SheetRange range);

  SheetTable table_;
  std::string name_;
  std::optional<Error>* error_;  // of the whole sheet
};

}  // namespace coilassay

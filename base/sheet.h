// Strict TOML: every key is asked for by name, and one nobody asked for is an error with its line.
#pragma once

#include <chrono>
#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "base/quantity.h"
#include "base/result.h"

namespace coilassay {

/// A table of a sheet. Reading a key marks it as known; `refuse_unknown_keys()` on the root, called last, names the
/// first key that was never asked for, with its line and the nearest known key. A key of the wrong type is bad_sheet.
class SheetTable {
 public:
  struct Node;  // hides the TOML library
  explicit SheetTable(std::shared_ptr<Node> node);

  bool has(std::string_view key) const;
  /// Every key of the table, in the order of its lines; for tables whose keys are names a person chose. None becomes known.
  std::vector<std::string> keys() const;
  Result<std::optional<std::string>> text(std::string_view key) const;
  Result<std::optional<double>> number(std::string_view key) const;
  Result<std::optional<long long>> integer(std::string_view key) const;
  Result<std::optional<bool>> flag(std::string_view key) const;
  Result<std::optional<std::chrono::year_month_day>> date(std::string_view key) const;
  Result<std::optional<std::vector<std::string>>> texts(std::string_view key) const;
  /// A value in words ("10 nF ± 1 %") or a bare number in SI.
  Result<std::optional<StatedValue>> value(std::string_view key, Unit expected) const;
  Result<std::optional<SheetTable>> table(std::string_view key) const;
  /// [[key]]: an array of tables; empty when absent.
  Result<std::vector<SheetTable>> tables(std::string_view key) const;

  /// Where a key stands: "bench.toml:7" (the table's own line when the key is absent).
  std::string place(std::string_view key) const;
  Result<void> refuse_unknown_keys() const;

 private:
  std::shared_ptr<Node> node_;
};

/// Reads a sheet from a file (at most 1 MiB) or from text; `name` stands in places.
Result<SheetTable> read_sheet(const std::string& path);
Result<SheetTable> parse_sheet(std::string_view text, std::string_view name);
/// The bytes of a sheet, for one whose digest is wanted; unreadable as read_sheet() says it.
Result<std::string> read_sheet_text(const std::string& path);

}  // namespace coilassay

// How a ledger lies in its SQLite file: tables, and the rules that keep them from being changed.
#pragma once

#include <span>
#include <string_view>

namespace coilassay {

/// Marks the file as a ledger of this program ("CoAs"), and the version of the layout below.
inline constexpr int kLedgerApplication = 0x436f4173;
inline constexpr int kLedgerVersion = 1;

/// One object of the file: a table, an index or a trigger, with the statement that makes it.
struct SchemaItem {
  std::string_view kind;
  std::string_view name;
  std::string_view sql;
};

/// In the order in which they are made. The text is stored by SQLite as it stands here, so that `verify` can compare it.
std::span<const SchemaItem> ledger_schema();

}  // namespace coilassay

// Tables of MIL-STD-105E (attributes) and MIL-STD-414 / ANSI/ASQ Z1.9 (variables), arrows resolved.
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <string_view>

#include "inspection/part_sheet.h"

namespace coilassay {

/// Columns of the tables, in percent nonconforming.
std::span<const double> attribute_aqls();
std::span<const double> variables_aqls();

/// Code letter of a lot; std::nullopt for a level the table does not have.
std::optional<char> attribute_letter(std::uint64_t lot_size, std::string_view level);
std::optional<char> variables_letter(std::uint64_t lot_size, std::string_view level);

struct AttributePlan {
  char letter = 'A';   // of the plan the arrows lead to
  std::uint64_t n = 0, accept = 0, reject = 1;
};
/// std::nullopt for an AQL that is no column.
std::optional<AttributePlan> attribute_plan(Severity105 severity, char code_letter, double aql_percent);

struct VariablesPlan {
  char letter = 'B';
  std::uint64_t n = 0;
  double k = 0;
};
/// std::nullopt for an AQL that is no column, and for tightened inspection at the first one.
std::optional<VariablesPlan> variables_plan(char code_letter, double aql_percent, bool tightened);

}  // namespace coilassay

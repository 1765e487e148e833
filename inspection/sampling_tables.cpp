// The tables of the standards, as data. An arrow is resolved here: v, the first plan below; ^, the first plan above.
#include "inspection/sampling_tables.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdlib>
#include <limits>

namespace coilassay {

namespace {

constexpr std::array kAttributeAqls = {0.01, 0.015, 0.025, 0.04, 0.065, 0.1, 0.15, 0.25, 0.4, 0.65, 1.0, 1.5, 2.5, 4.0, 6.5, 10.0};

/// A row of a master table: sample size and one cell per AQL, "Ac/Re" or an arrow.
struct MasterRow {
  char letter;
  std::uint64_t n;
  std::string_view cells;
};

// MIL-STD-105E (10 May 1989), Table II-A: single sampling, normal inspection.
constexpr MasterRow kNormal[] = {
    {'A', 2, "v v v v v v v v v v v v v v 0/1 v"},
    {'B', 3, "v v v v v v v v v v v v v 0/1 ^ v"},
    {'C', 5, "v v v v v v v v v v v v 0/1 ^ v 1/2"},
    {'D', 8, "v v v v v v v v v v v 0/1 ^ v 1/2 2/3"},
    {'E', 13, "v v v v v v v v v v 0/1 ^ v 1/2 2/3 3/4"},
    {'F', 20, "v v v v v v v v v 0/1 ^ v 1/2 2/3 3/4 5/6"},
    {'G', 32, "v v v v v v v v 0/1 ^ v 1/2 2/3 3/4 5/6 7/8"},
    {'H', 50, "v v v v v v v 0/1 ^ v 1/2 2/3 3/4 5/6 7/8 10/11"},
    {'J', 80, "v v v v v v 0/1 ^ v 1/2 2/3 3/4 5/6 7/8 10/11 14/15"},
    {'K', 125, "v v v v v 0/1 ^ v 1/2 2/3 3/4 5/6 7/8 10/11 14/15 21/22"},
    {'L', 200, "v v v v 0/1 ^ v 1/2 2/3 3/4 5/6 7/8 10/11 14/15 21/22 ^"},
    {'M', 315, "v v v 0/1 ^ v 1/2 2/3 3/4 5/6 7/8 10/11 14/15 21/22 ^ ^"},
    {'N', 500, "v v 0/1 ^ v 1/2 2/3 3/4 5/6 7/8 10/11 14/15 21/22 ^ ^ ^"},
    {'P', 800, "v 0/1 ^ v 1/2 2/3 3/4 5/6 7/8 10/11 14/15 21/22 ^ ^ ^ ^"},
    {'Q', 1250, "0/1 ^ v 1/2 2/3 3/4 5/6 7/8 10/11 14/15 21/22 ^ ^ ^ ^ ^"},
    {'R', 2000, "^ ^ 1/2 2/3 3/4 5/6 7/8 10/11 14/15 21/22 ^ ^ ^ ^ ^ ^"},
};

// Table II-B: tightened inspection.
constexpr MasterRow kTightened[] = {
    {'A', 2, "v v v v v v v v v v v v v v v v"},
    {'B', 3, "v v v v v v v v v v v v v v 0/1 v"},
    {'C', 5, "v v v v v v v v v v v v v 0/1 v v"},
    {'D', 8, "v v v v v v v v v v v v 0/1 v v 1/2"},
    {'E', 13, "v v v v v v v v v v v 0/1 v v 1/2 2/3"},
    {'F', 20, "v v v v v v v v v v 0/1 v v 1/2 2/3 3/4"},
    {'G', 32, "v v v v v v v v v 0/1 v v 1/2 2/3 3/4 5/6"},
    {'H', 50, "v v v v v v v v 0/1 v v 1/2 2/3 3/4 5/6 8/9"},
    {'J', 80, "v v v v v v v 0/1 v v 1/2 2/3 3/4 5/6 8/9 12/13"},
    {'K', 125, "v v v v v v 0/1 v v 1/2 2/3 3/4 5/6 8/9 12/13 18/19"},
    {'L', 200, "v v v v v 0/1 v v 1/2 2/3 3/4 5/6 8/9 12/13 18/19 ^"},
    {'M', 315, "v v v v 0/1 v v 1/2 2/3 3/4 5/6 8/9 12/13 18/19 ^ ^"},
    {'N', 500, "v v v 0/1 v v 1/2 2/3 3/4 5/6 8/9 12/13 18/19 ^ ^ ^"},
    {'P', 800, "v v 0/1 v v 1/2 2/3 3/4 5/6 8/9 12/13 18/19 ^ ^ ^ ^"},
    {'Q', 1250, "v 0/1 v v 1/2 2/3 3/4 5/6 8/9 12/13 18/19 ^ ^ ^ ^ ^"},
    {'R', 2000, "0/1 ^ v 1/2 2/3 3/4 5/6 8/9 12/13 18/19 ^ ^ ^ ^ ^ ^"},
    {'S', 3150, "^ ^ 1/2 ^ ^ ^ ^ ^ ^ ^ ^ ^ ^ ^ ^ ^"},  // for the one arrow that leads below R
};

// Table II-C: reduced inspection. Between Ac and Re the lot is accepted, and normal inspection comes back.
constexpr MasterRow kReduced[] = {
    {'A', 2, "v v v v v v v v v v v v v v 0/1 v"},
    {'B', 2, "v v v v v v v v v v v v v 0/1 ^ v"},
    {'C', 2, "v v v v v v v v v v v v 0/1 ^ v 0/2"},
    {'D', 3, "v v v v v v v v v v v 0/1 ^ v 0/2 1/3"},
    {'E', 5, "v v v v v v v v v v 0/1 ^ v 0/2 1/3 1/4"},
    {'F', 8, "v v v v v v v v v 0/1 ^ v 0/2 1/3 1/4 2/5"},
    {'G', 13, "v v v v v v v v 0/1 ^ v 0/2 1/3 1/4 2/5 3/6"},
    {'H', 20, "v v v v v v v 0/1 ^ v 0/2 1/3 1/4 2/5 3/6 5/8"},
    {'J', 32, "v v v v v v 0/1 ^ v 0/2 1/3 1/4 2/5 3/6 5/8 7/10"},
    {'K', 50, "v v v v v 0/1 ^ v 0/2 1/3 1/4 2/5 3/6 5/8 7/10 10/13"},
    {'L', 80, "v v v v 0/1 ^ v 0/2 1/3 1/4 2/5 3/6 5/8 7/10 10/13 ^"},
    {'M', 125, "v v v 0/1 ^ v 0/2 1/3 1/4 2/5 3/6 5/8 7/10 10/13 ^ ^"},
    {'N', 200, "v v 0/1 ^ v 0/2 1/3 1/4 2/5 3/6 5/8 7/10 10/13 ^ ^ ^"},
    {'P', 315, "v 0/1 ^ v 0/2 1/3 1/4 2/5 3/6 5/8 7/10 10/13 ^ ^ ^ ^"},
    {'Q', 500, "0/1 ^ v 0/2 1/3 1/4 2/5 3/6 5/8 7/10 10/13 ^ ^ ^ ^ ^"},
    {'R', 800, "^ ^ 0/2 1/3 1/4 2/5 3/6 5/8 7/10 10/13 ^ ^ ^ ^ ^ ^"},
};

struct LetterRow {
  std::uint64_t from;        // smallest lot of the row
  std::string_view letters;  // one per level
};

// MIL-STD-105E, Table I: S-1, S-2, S-3, S-4, I, II, III.
constexpr std::string_view kAttributeLevels[] = {"S-1", "S-2", "S-3", "S-4", "I", "II", "III"};
constexpr LetterRow kAttributeLetters[] = {
    {2, "AAAAAAB"},
    {9, "AAAAABC"},
    {16, "AABBBCD"},
    {26, "ABBCCDE"},
    {51, "BBCCCEF"},
    {91, "BBCDDFG"},
    {151, "BCDEEGH"},
    {281, "BCDEFHJ"},
    {501, "CCEFGJK"},
    {1201, "CDEGHKL"},
    {3201, "CDFGJLM"},
    {10001, "CDFHKMN"},
    {35001, "DEGJLNP"},
    {150001, "DEGJMPQ"},
    {500001, "DEHKNQR"},
};

// ANSI/ASQ Z1.9, Table A-2: S-3, S-4, I, II, III.
constexpr std::string_view kVariablesLevels[] = {"S-3", "S-4", "I", "II", "III"};
constexpr LetterRow kVariablesLetters[] = {
    {2, "BBBBC"},
    {9, "BBBBD"},
    {16, "BBBCE"},
    {26, "BBCDF"},
    {51, "BBDEG"},
    {91, "BCEFH"},
    {151, "BDFGI"},
    {281, "CEGHJ"},
    {401, "CEGIJ"},
    {501, "DFHJK"},
    {1201, "EGIKL"},
    {3201, "FHJLM"},
    {10001, "GIKMN"},
    {35001, "HJLNP"},
    {150001, "HKMPP"},
    {500001, "HKNPP"},
};

// MIL-STD-414 (1957), Table B-1, standard deviation method, normal inspection; letters and sizes of ANSI/ASQ Z1.9.
// Tightened inspection reads the column one to the left.
constexpr double kNone = std::numeric_limits<double>::quiet_NaN();  // an arrow down
constexpr std::array kVariablesAqls = {0.04, 0.065, 0.1, 0.15, 0.25, 0.4, 0.65, 1.0, 1.5, 2.5, 4.0, 6.5, 10.0, 15.0};
struct ConstantRow {
  char letter;
  std::uint64_t n;
  std::array<double, kVariablesAqls.size()> k;
};
constexpr ConstantRow kConstants[] = {
    {'B', 3, {kNone, kNone, kNone, kNone, kNone, kNone, kNone, kNone, kNone, 1.12, 0.958, 0.765, 0.566, 0.341}},
    {'C', 4, {kNone, kNone, kNone, kNone, kNone, kNone, kNone, 1.45, 1.34, 1.17, 1.01, 0.814, 0.617, 0.393}},
    {'D', 5, {kNone, kNone, kNone, kNone, kNone, kNone, 1.65, 1.53, 1.40, 1.24, 1.07, 0.874, 0.675, 0.455}},
    {'E', 7, {kNone, kNone, kNone, kNone, 2.00, 1.88, 1.75, 1.62, 1.50, 1.33, 1.15, 0.955, 0.755, 0.536}},
    {'F', 10, {kNone, kNone, kNone, 2.24, 2.11, 1.98, 1.84, 1.72, 1.58, 1.41, 1.23, 1.03, 0.828, 0.611}},
    {'G', 15, {2.64, 2.53, 2.42, 2.32, 2.20, 2.06, 1.91, 1.79, 1.65, 1.47, 1.30, 1.09, 0.886, 0.664}},
    {'H', 20, {2.69, 2.58, 2.47, 2.36, 2.24, 2.11, 1.96, 1.82, 1.69, 1.51, 1.33, 1.12, 0.917, 0.695}},
    {'I', 25, {2.72, 2.61, 2.50, 2.40, 2.26, 2.14, 1.98, 1.85, 1.72, 1.53, 1.35, 1.14, 0.936, 0.712}},
    {'J', 35, {2.77, 2.65, 2.54, 2.45, 2.31, 2.18, 2.03, 1.89, 1.76, 1.57, 1.39, 1.18, 0.969, 0.745}},
    {'K', 50, {2.83, 2.71, 2.60, 2.50, 2.35, 2.22, 2.08, 1.93, 1.80, 1.61, 1.42, 1.21, 1.00, 0.774}},
    {'L', 75, {2.90, 2.77, 2.66, 2.55, 2.41, 2.27, 2.12, 1.98, 1.84, 1.65, 1.46, 1.24, 1.03, 0.804}},
    {'M', 100, {2.92, 2.80, 2.69, 2.58, 2.43, 2.29, 2.14, 2.00, 1.86, 1.67, 1.48, 1.26, 1.05, 0.819}},
    {'N', 150, {2.96, 2.84, 2.73, 2.61, 2.47, 2.33, 2.18, 2.03, 1.89, 1.70, 1.51, 1.29, 1.07, 0.841}},
    {'P', 200, {2.97, 2.85, 2.73, 2.62, 2.47, 2.33, 2.18, 2.04, 1.89, 1.70, 1.51, 1.29, 1.07, 0.845}},
};

std::span<const MasterRow> master(Severity105 severity) {
  if (severity == Severity105::tightened) return kTightened;
  if (severity == Severity105::reduced) return kReduced;
  return kNormal;
}

std::string_view cell_of(const MasterRow& row, std::size_t column) {
  std::string_view rest = row.cells;
  for (; column > 0; --column) rest.remove_prefix(rest.find(' ') + 1);
  return rest.substr(0, rest.find(' '));
}

template <class Columns>
std::optional<std::size_t> column_of(const Columns& columns, double aql_percent) {
  const auto found = std::find(columns.begin(), columns.end(), aql_percent);
  if (found == columns.end()) return std::nullopt;
  return static_cast<std::size_t>(found - columns.begin());
}

template <class Rows, class Levels>
std::optional<char> letter_of(const Rows& rows, const Levels& levels, std::uint64_t lot_size, std::string_view level) {
  const auto column = std::find(std::begin(levels), std::end(levels), level);
  if (column == std::end(levels) || lot_size == 0) return std::nullopt;
  const LetterRow* chosen = &*std::begin(rows);  // a lot of one is inspected whole by the smallest plan
  for (const LetterRow& row : rows) {
    if (row.from <= lot_size) chosen = &row;
  }
  return chosen->letters[static_cast<std::size_t>(column - std::begin(levels))];
}

std::uint64_t whole_number(std::string_view text) { return std::strtoull(std::string(text).c_str(), nullptr, 10); }

}  // namespace

std::span<const double> attribute_aqls() { return kAttributeAqls; }
std::span<const double> variables_aqls() { return kVariablesAqls; }

std::optional<char> attribute_letter(std::uint64_t lot_size, std::string_view level) {
  return letter_of(kAttributeLetters, kAttributeLevels, lot_size, level);
}

std::optional<char> variables_letter(std::uint64_t lot_size, std::string_view level) {
  return letter_of(kVariablesLetters, kVariablesLevels, lot_size, level);
}

std::optional<AttributePlan> attribute_plan(Severity105 severity, char code_letter, double aql_percent) {
  const auto column = column_of(kAttributeAqls, aql_percent);
  if (!column || severity == Severity105::discontinued) return std::nullopt;
  const std::span<const MasterRow> rows = master(severity);
  auto row = std::find_if(rows.begin(), rows.end(), [&](const MasterRow& r) { return r.letter == code_letter; });
  while (row != rows.end()) {
    const std::string_view cell = cell_of(*row, *column);
    if (cell == "v") {
      ++row;
    } else if (cell == "^") {
      if (row == rows.begin()) break;
      --row;
    } else {
      const std::size_t slash = cell.find('/');
      return AttributePlan{row->letter, row->n, whole_number(cell.substr(0, slash)), whole_number(cell.substr(slash + 1))};
    }
  }
  return std::nullopt;
}

std::optional<VariablesPlan> variables_plan(char code_letter, double aql_percent, bool tightened) {
  auto column = column_of(kVariablesAqls, aql_percent);
  if (!column || (tightened && *column == 0)) return std::nullopt;
  if (tightened) --*column;
  const auto end = std::end(kConstants);
  auto row = std::find_if(std::begin(kConstants), end, [&](const ConstantRow& r) { return r.letter == code_letter; });
  while (row != end && std::isnan(row->k[*column])) ++row;
  if (row == end) return std::nullopt;
  return VariablesPlan{row->letter, row->n, row->k[*column]};
}

}  // namespace coilassay

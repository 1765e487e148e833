// Which signs separate the cells and the decimals of a table, and where its numbers begin.
#pragma once

#include <cstddef>
#include <string>
#include <vector>

#include "acquire/reader.h"
#include "acquire/table_cells.h"

namespace coilassay {

struct TableDialect {
  char delimiter = ',';         // ' ' for any run of blanks and tabs
  char decimal = '.';
  std::size_t width = 0;        // cells in a row of numbers
  std::size_t first_row = 0;    // index of the first row of numbers among the lines looked at
  std::size_t beside = 0;       // rows from there on that have settings in columns which are empty further down
  std::vector<std::size_t> empty_columns;  // those, counted from 0
};

/// Finds the dialect from the first lines of a file, or takes what the options say.
///
/// A row of numbers has at least one number, and nothing but numbers and signs of their absence. The dialect that
/// makes most lines such rows of one width is taken.
/// @return not_a_capture when no table of numbers is found; ambiguous when a comma can be both separator and decimal
///         sign, with the options that settle it.
Result<TableDialect> find_dialect(const std::string& name, const std::vector<TableLine>& lines,
                                  const ReadOptions& options);

/// Whether every cell is a number or a sign of its absence, with at least one number among them.
bool is_row_of_numbers(const std::vector<std::string_view>& cells, char decimal);

}  // namespace coilassay

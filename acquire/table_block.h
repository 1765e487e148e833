// The bulk of a table: a block of whole lines into columns of doubles, in one forward scan.
#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/byte_source_lines.h"

namespace coilassay {

/// How a row is read: one plan for each cell.
struct ColumnPlan {
  bool stored = true;
  int shift = 0;  // power of ten from the column's unit to SI
};

struct TableLayout {
  char delimiter = ',';
  char decimal = '.';
  std::vector<ColumnPlan> columns;
  std::size_t stored() const;
};

/// The first line of a block that breaks the table's shape.
struct RowFault {
  std::size_t line = 0;  // within the block, counted from 0
  std::string finding;   // "has 1 cell where the rows before have 2"
};

struct BlockColumns {
  std::vector<std::vector<double>> values;  // one for each stored column; the first `rows` are meaningful
  std::vector<std::size_t> missing;         // of which over_range
  std::vector<std::size_t> over_range;
  std::size_t rows = 0;
  std::size_t lines = 0;
  std::optional<RowFault> fault;
};

/// Reads the rows of a block from `from` on, until the end or the first fault; blank lines and comments are passed over.
void read_block(const LineBlock& block, std::size_t from, const TableLayout& layout, BlockColumns& into);

}  // namespace coilassay

// The bulk of a table: a block of whole lines into columns of doubles, in one forward scan.
#pragma once

#include <cstddef>
#include <cstdint>
#include <string>
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

/// A line among the rows that is none itself: the start of another record, a comment, or damage.
struct TableBreak {
  std::size_t row = 0;   // rows of the block before it
  std::size_t line = 0;  // within the block, counted from 0
  bool comment = false;  // begins with # ! or %
  bool words = false;    // holds no number in its place: may introduce a record
  std::string text;      // its beginning
  std::string finding;   // what is wrong with it as a row: "has 1 cell where those before have 2"
};

struct BlockColumns {
  std::vector<std::vector<double>> values;           // one for each stored column; the first `rows` are meaningful
  std::vector<std::vector<std::uint32_t>> over_range;  // rows in which the instrument was over range, by stored column
  std::size_t rows = 0;
  std::size_t lines = 0;
  std::vector<TableBreak> breaks;  // at most kMostBreaks; reading stops there
  static constexpr std::size_t kMostBreaks = 10000;
};

/// Reads the rows of a block from byte `from` on; blank lines are passed over, other lines that are no rows are breaks.
void read_block(const LineBlock& block, std::size_t from, const TableLayout& layout, BlockColumns& into);

}  // namespace coilassay

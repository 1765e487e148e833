// The first stretch of a table: its lines, its dialect, and what stands above the numbers.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "acquire/reader.h"
#include "acquire/table_cells.h"
#include "acquire/table_dialect.h"
#include "acquire/table_header.h"

namespace coilassay {

struct TableHead {
  std::vector<TableLine> lines;  // views of the stretch
  TableDialect dialect;
  TableHeader header;
  bool utf8 = true;              // the lines above the numbers are; else they are taken as Windows-1252
};

/// @param text  whole lines from the beginning of the file, in UTF-8 or Windows-1252
/// @return not_a_capture: empty, binary, the placeholder of a large-file store, no table of numbers; ambiguous
Result<TableHead> understand_head(const std::string& name, std::string_view text, const ReadOptions& options);

/// The headings of a table in the writing of a reading key, "CH1 [mV]", one for each column; empty when a column has no name, or
/// one that a key cannot state so that it is understood the same way. Opens the file again and reads its first block.
Result<std::vector<std::string>> reading_key_columns(const std::string& path, const ReadOptions& options);

}  // namespace coilassay

// What the lines above the numbers say: names, units, settings.
#pragma once

#include <cstddef>
#include <map>
#include <optional>
#include <string>
#include <vector>

#include "acquire/table_cells.h"
#include "acquire/table_dialect.h"
#include "acquire/table_units.h"

namespace coilassay {

struct ColumnHeading {
  std::string name;  // empty when the file has none
  std::optional<ColumnUnit> unit;
  bool left_out = false;
};

struct TableHeader {
  std::vector<ColumnHeading> columns;  // one for each cell of a row of numbers
  bool has_names = false;
  std::map<std::string, std::string> settings;  // as written; UTF-8
  std::optional<double> interval_s;             // stated step of time
  std::optional<double> start_s;
  std::optional<double> count;                  // stated number of samples
  std::map<std::string, double> full_scale;     // by channel name, "" for all; largest magnitude in SI
  std::map<std::string, double> resolution;     // by channel name; step between codes in SI
  std::string segment;
  std::optional<ColumnUnit> vertical_unit;      // of the one channel
  std::string source;                           // its name
  std::string names_line;   // as it stands
  std::string first_label;  // of the first record, when a line between names and numbers announces it
};

/// Reads the lines before dialect.first_row: rows of key and value (or "key: value", "key = value", comment signs in
/// front or not), then a row of names and perhaps a row of units.
TableHeader understand_header(const std::vector<TableLine>& lines, const TableDialect& dialect);

/// Puts the headings of a reading key in place of the file's.
/// @param first_line  of the numbers, for errors
/// @return missing_column when the file does not fit the key
Result<void> apply_reading_key(const std::string& name, std::size_t first_line, const std::vector<std::string>& columns,
                               TableHeader& header);

}  // namespace coilassay

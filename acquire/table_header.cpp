#include "acquire/table_header.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "acquire/number_scan.h"
#include "acquire/table_join.h"
#include "acquire/table_settings.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

using Cells = std::vector<std::string>;

bool is_number(const std::string& cell, char decimal) { return read_cell(cell, decimal).kind == CellKind::number; }

Cells cells_in_words(std::string_view line, char delimiter) {
  while (!line.empty() && (line.front() == '#' || line.front() == '!' || line.front() == '%')) line.remove_prefix(1);
  Cells cells;
  for (const std::string_view cell : cells_of(line, delimiter)) cells.push_back(cell_text(cell));
  while (!cells.empty() && cells.back().empty()) cells.pop_back();
  return cells;
}

/// "(ms)", "[V]", "Volt", nothing at all, or a word for a row number.
bool is_unit_cell(const std::string& cell) {
  std::string_view text = cell;
  if (text.size() > 2 && (text.front() == '(' || text.front() == '[')) text = text.substr(1, text.size() - 2);
  return text.empty() || text == "-" || names_index(text) || understand_column_unit(text).has_value();
}

std::optional<ColumnUnit> unit_of_cell(const std::string& cell) {
  std::string_view text = cell;
  if (text.size() > 2 && (text.front() == '(' || text.front() == '[')) text = text.substr(1, text.size() - 2);
  return understand_column_unit(text);
}

bool is_row_of_units(const Cells& cells, std::size_t width) {
  const std::size_t looked_at = std::min(cells.size(), width);
  std::size_t units = 0;
  for (std::size_t c = 0; c < looked_at; ++c) {
    if (!is_unit_cell(cells[c])) return false;
    if (unit_of_cell(cells[c])) ++units;
  }
  return units > 0;
}

/// Names are words, about as many as there are columns.
bool is_row_of_names(const Cells& cells, std::size_t width, char decimal) {
  if (cells.empty() || cells.size() < width) return false;
  std::size_t words = 0;
  for (std::size_t c = 0; c < std::min(cells.size(), width); ++c) {
    if (is_number(cells[c], decimal)) return false;
    if (!cells[c].empty()) ++words;
  }
  return words > 0 && words + 1 >= width;
}

/// Above units names may be numbers of channels: "x-axis,1,2".
bool is_row_above_units(const Cells& cells, std::size_t width, char decimal) {
  if (cells.empty() || cells.size() < width) return false;
  return std::any_of(cells.begin(), cells.end(), [decimal](const std::string& cell) { return !cell.empty() && !is_number(cell, decimal); });
}

/// A blank-separated heading such as "CH1 [V]" falls apart into two cells: the bracket belongs to the name before it.
Cells rejoined(Cells cells, std::size_t width) {
  if (cells.size() <= width) return cells;
  Cells joined;
  for (std::string& cell : cells) {
    if (!joined.empty() && !cell.empty() && (cell.front() == '(' || cell.front() == '[') && unit_of_cell(cell)) {
      joined.back() += " " + cell;
    } else {
      joined.push_back(std::move(cell));
    }
  }
  return joined;
}

/// Headings beyond the columns with a number below them ("Start,Increment" over "-3e-3,2e-6") are settings.
void take_settings_beside(const Cells& names, const Cells& below, std::size_t width, char decimal,
                          std::map<std::string, std::string>& settings) {
  for (std::size_t c = 0; c < std::min(names.size(), below.size()); ++c) {
    const bool beyond = c >= width || understand_column_unit(below[c]) == std::nullopt;
    if (beyond && !names[c].empty() && is_number(below[c], decimal)) settings[names[c]] = below[c];
  }
}

/// Key, value and unit in the columns that are empty further down.
void read_settings_beside(std::string_view line, const TableDialect& dialect, std::map<std::string, std::string>& settings) {
  const auto cells = cells_of(line, dialect.delimiter);
  std::string setting;
  for (const std::size_t c : dialect.empty_columns) {
    if (c >= cells.size()) continue;
    if (!setting.empty()) setting += dialect.delimiter;
    setting += cells[c];
  }
  read_setting(setting, dialect.delimiter, settings);
}

/// "Record,Waveform" names columns, "Record 5" announces a record.
bool names_columns(std::string_view line, const TableDialect& dialect) {
  return cells_in_words(line, dialect.delimiter).size() > 1;
}

/// Columns of the data that have anything in them: "0,1.2,," has two.
std::size_t filled_width(const std::vector<TableLine>& lines, const TableDialect& dialect) {
  std::size_t filled = 0;
  for (std::size_t i = dialect.first_row; i < std::min(lines.size(), dialect.first_row + 100); ++i) {
    const auto cells = cells_of(lines[i].text, dialect.delimiter);
    for (std::size_t c = filled; c < std::min(cells.size(), dialect.width); ++c) {
      if (!bare_cell(cells[c]).empty()) filled = c + 1;
    }
  }
  return filled;
}

}  // namespace

TableHeader understand_header(const std::vector<TableLine>& lines, const TableDialect& dialect) {
  TableHeader header;
  header.columns.resize(dialect.width);
  std::vector<std::string_view> above;
  for (std::size_t i = 0; i < dialect.first_row; ++i) {
    if (!bare_cell(lines[i].text).empty()) above.push_back(lines[i].text);
  }
  const std::size_t width = filled_width(lines, dialect);
  // "Step Information: ..." or "BEGIN" right above the numbers announces the first record.
  while (!above.empty() && introduces_record(above.back()) && !names_columns(above.back(), dialect)) {
    const std::string text = cell_text(above.back());
    if (!lower_case(text).starts_with("begin") && !lower_case(text).starts_with("data")) header.first_label = text;
    above.pop_back();
  }
  const auto cells_from_below = [&](std::size_t n) {
    return n < above.size() ? rejoined(cells_in_words(above[above.size() - 1 - n], dialect.delimiter), width) : Cells{};
  };

  Cells last = cells_from_below(0);
  Cells names;
  Cells units;
  std::size_t used = 0;
  if (is_row_of_units(last, width) && is_row_above_units(cells_from_below(1), width, dialect.decimal)) {
    names = cells_from_below(1);
    header.names_line = cell_text(above[above.size() - 2]);
    units = std::move(last);
    used = 2;
    take_settings_beside(names, units, width, dialect.decimal, header.settings);
  } else if (is_row_of_names(last, width, dialect.decimal)) {
    names = std::move(last);
    header.names_line = cell_text(above.back());
    used = 1;
  }

  const bool all_units = std::all_of(names.begin(), names.end(), [](const std::string& name) { return unit_of_cell(name).has_value(); });
  for (std::size_t c = 0; c < std::min(names.size(), dialect.width); ++c) {
    Heading heading = understand_heading(names[c]);
    header.columns[c].name = heading.name;
    header.columns[c].unit = heading.unit;
    header.has_names |= !heading.name.empty();
    // "second,Volt" alone: the units are all there is of names.
    if (units.empty() && all_units) header.columns[c].unit = unit_of_cell(names[c]);
  }
  for (std::size_t c = 0; c < std::min(units.size(), dialect.width); ++c) {
    if (const auto unit = unit_of_cell(units[c])) header.columns[c].unit = unit;
  }
  for (std::size_t i = 0; i + used < above.size(); ++i) read_setting(above[i], dialect.delimiter, header.settings);
  for (std::size_t i = 0; i < dialect.beside; ++i) read_settings_beside(lines[dialect.first_row + i].text, dialect, header.settings);
  interpret_settings(header, dialect.decimal);
  return header;
}

Result<void> apply_reading_key(const std::string& name, std::size_t first_line, const std::vector<std::string>& columns,
                               TableHeader& header) {
  constexpr const char* kRemedy = "look at the file with describe, and correct [file] columns in the bench sheet or export as before";
  const std::string place = fmt::format("{}:{}", name, first_line);
  if (columns.size() != header.columns.size()) {
    return failure(Problem::missing_column, place,
                   fmt::format("the rows have {} columns where the reading key names {}", header.columns.size(), columns.size()), kRemedy);
  }
  for (std::size_t c = 0; c < columns.size(); ++c) {
    ColumnHeading& heading = header.columns[c];
    if (columns[c] == "-") {
      heading.left_out = true;
      continue;
    }
    const Heading stated = understand_heading(columns[c]);
    if (!heading.name.empty() && heading.name != stated.name) {
      return failure(Problem::missing_column, place,
                     fmt::format("column {} is '{}' where the reading key names '{}'", c + 1, shown(heading.name, 60), shown(stated.name, 60)),
                     kRemedy);
    }
    heading.name = stated.name;
    if (stated.unit) heading.unit = stated.unit;
    header.has_names = true;
  }
  return {};
}

}  // namespace coilassay

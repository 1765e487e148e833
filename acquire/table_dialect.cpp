#include "acquire/table_dialect.h"

#include <fmt/format.h>

#include <algorithm>
#include <map>
#include <optional>

#include "acquire/number_scan.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

constexpr std::size_t kLinesJudged = 400;
constexpr std::size_t kMostColumns = 1024;

struct Candidate {
  TableDialect dialect;
  std::size_t rows = 0;    // lines judged that are rows of numbers of that width
};

/// The later half of what is seen: preambles come first.
std::vector<TableLine> lines_to_judge(const std::vector<TableLine>& lines) {
  std::vector<TableLine> written;
  for (const TableLine& line : lines) {
    if (!bare_cell(line.text).empty()) written.push_back(line);
  }
  const std::size_t from = written.size() / 2;
  std::vector<TableLine> judged(written.begin() + static_cast<std::ptrdiff_t>(from), written.end());
  if (judged.size() > kLinesJudged) judged.resize(kLinesJudged);
  return judged;
}

Candidate judge(const std::vector<TableLine>& lines, char delimiter, char decimal) {
  std::map<std::size_t, std::size_t> widths;
  for (const TableLine& line : lines) {
    const auto cells = cells_of(line.text, delimiter);
    if (!is_row_of_numbers(cells, decimal)) continue;
    ++widths[cells.size()];
  }
  Candidate found;
  found.dialect.delimiter = delimiter;
  found.dialect.decimal = decimal;
  for (const auto& [width, count] : widths) {
    if (count >= found.rows) {
      found.rows = count;
      found.dialect.width = width;
    }
  }
  return found;
}

/// Best first: most rows read, then tabs before blanks (which may part thousands), then most columns.
bool better(const Candidate& a, const Candidate& b) {
  if (a.rows != b.rows) return a.rows > b.rows;
  const auto tabs = [](const Candidate& c) { return c.dialect.delimiter == '\t' && c.dialect.width > 1; };
  if (tabs(a) && b.dialect.delimiter == ' ') return true;
  if (tabs(b) && a.dialect.delimiter == ' ') return false;
  return a.dialect.width > b.dialect.width;
}

/// Whether each decimal sign reads rows that the other cannot.
bool both_decimals(const std::vector<TableLine>& lines, const TableDialect& dialect) {
  bool only_point = false;
  bool only_comma = false;
  for (const TableLine& line : lines) {
    const auto cells = cells_of(line.text, dialect.delimiter);
    if (cells.size() != dialect.width) continue;
    const bool point = is_row_of_numbers(cells, '.');
    const bool comma = is_row_of_numbers(cells, ',');
    only_point |= point && !comma;
    only_comma |= comma && !point;
  }
  return only_point && only_comma;
}

bool only_digits(std::string_view cell) {
  cell = bare_cell(cell);
  return !cell.empty() && std::all_of(cell.begin(), cell.end(), number_scan_detail::digit);
}

bool is_integer(std::string_view cell) {
  cell = bare_cell(cell);
  if (cell.starts_with('-') || cell.starts_with('+')) cell.remove_prefix(1);
  return only_digits(cell);
}

/// A fraction behind a decimal comma looks like a cell of its own: digits without a sign, often with zeros in front.
/// Returns what gives it away, or nothing.
std::optional<std::string> comma_is_both(const std::vector<TableLine>& lines, const TableDialect& dialect) {
  std::map<std::size_t, std::size_t> widths;
  std::size_t fraction_zeros = 0;
  bool exponents = false;
  std::size_t looked_at = 0;
  for (std::size_t i = dialect.first_row; i < lines.size() && looked_at < kLinesJudged; ++i) {
    const auto cells = cells_of(lines[i].text, ',');
    if (!is_row_of_numbers(cells, '.')) continue;
    // Real decimal points, or a sign on every second cell, and the commas can only separate.
    for (std::size_t c = 0; c < cells.size(); ++c) {
      const std::string_view cell = bare_cell(cells[c]);
      const std::size_t e = cell.find_first_of("eE");
      const bool fraction_with_exponent = c % 2 == 1 && e != std::string_view::npos && only_digits(cell.substr(0, e));
      if (!is_integer(cell) && !cell.empty() && !fraction_with_exponent) return std::nullopt;
      if (c % 2 == 1 && cells.size() % 2 == 0 && (cell.starts_with('-') || cell.starts_with('+'))) return std::nullopt;
      exponents |= fraction_with_exponent;
    }
    ++looked_at;
    ++widths[cells.size()];
    for (std::size_t c = 1; c < cells.size(); ++c) {
      const std::string_view cell = bare_cell(cells[c]);
      if (cell.size() > 1 && cell.front() == '0' && only_digits(cell)) ++fraction_zeros;
    }
  }
  if (looked_at == 0) return std::nullopt;
  if (exponents) return "cells such as '5e-3' beside whole numbers look like digits behind a decimal comma";
  if (fraction_zeros > 0) return "cells such as '05' look like digits behind a decimal comma";
  if (widths.size() > 1) return "the rows have different numbers of cells, as whole numbers written without a comma would";
  if (dialect.first_row > 0 && dialect.width > 1 && dialect.width % 2 == 0) {
    const auto names = cells_of(lines[dialect.first_row - 1].text, ',');
    const bool in_words = std::none_of(names.begin(), names.end(), is_integer);
    if (in_words && names.size() * 2 == dialect.width) {
      return fmt::format("{} names stand above {} cells in each row", names.size(), dialect.width);
    }
  }
  return std::nullopt;
}

tl::unexpected<Error> no_table(const std::string& name, const std::vector<TableLine>& lines) {
  for (const TableLine& line : lines) {
    if (!bare_cell(line.text).empty()) {
      return failure(Problem::not_a_capture, name,
                     fmt::format("no table of numbers was found in it; it begins '{}'", shown(cell_text(line.text), 60)),
                     "export the waveform as CSV; if it is one, state the separators in the bench sheet: [file] delimiter, decimal");
    }
  }
  return failure(Problem::not_a_capture, name, "it holds nothing but blank lines", "export the waveform again");
}

std::vector<char> delimiters(const ReadOptions& options) {
  if (options.delimiter) return {*options.delimiter};
  return {',', ';', '\t', ' ', '|'};
}

std::vector<char> decimals(const ReadOptions& options) {
  if (options.decimal) return {*options.decimal};
  return {'.', ','};
}

/// A remark between rows; one with as many cells as a row may be the names above it.
bool is_remark(std::string_view line, std::size_t cells, std::size_t width) {
  const std::string_view text = bare_cell(line);
  return cells < width && (text.starts_with('#') || text.starts_with('!') || text.starts_with('%'));
}

/// First line from which rows of numbers run on: the next two, where there are two, are such rows as well. Remarks between
/// them do not count.
std::size_t first_row(const std::vector<TableLine>& lines, const TableDialect& dialect) {
  std::size_t run = 0;
  std::size_t begin = lines.size();
  for (std::size_t i = 0; i < lines.size(); ++i) {
    if (bare_cell(lines[i].text).empty()) continue;
    const auto cells = cells_of(lines[i].text, dialect.delimiter);
    if (cells.size() == dialect.width && is_row_of_numbers(cells, dialect.decimal)) {
      if (run++ == 0) begin = i;
      if (run == 3) return begin;
    } else if (!is_remark(lines[i].text, cells.size(), dialect.width)) {
      run = 0;
    }
  }
  return begin;
}

/// A table of another width before the one that was found: a file whose rows lost or gained a cell from some line on.
/// Returns that width, or 0.
std::size_t other_width_before(const std::vector<TableLine>& lines, const TableDialect& dialect) {
  constexpr std::size_t kRun = 3;  // a preamble may hold a row or two of numbers
  std::size_t run = 0;
  std::size_t width = 0;
  for (std::size_t i = 0; i < dialect.first_row; ++i) {
    const auto cells = cells_of(lines[i].text, dialect.delimiter);
    if (!is_row_of_numbers(cells, dialect.decimal)) {
      run = 0;
      continue;
    }
    run = cells.size() == width ? run + 1 : 1;
    width = cells.size();
    if (run == kRun && width != dialect.width) return width;
  }
  return 0;
}

/// Columns that are empty in the first rows of numbers.
std::vector<std::size_t> empty_columns(const std::vector<TableLine>& lines, const TableDialect& dialect) {
  std::vector<bool> filled(dialect.width, false);
  std::size_t rows = 0;
  for (std::size_t i = dialect.first_row; i < lines.size() && rows < 100; ++i) {
    const auto cells = cells_of(lines[i].text, dialect.delimiter);
    if (cells.size() != dialect.width || !is_row_of_numbers(cells, dialect.decimal)) continue;
    ++rows;
    for (std::size_t c = 0; c < dialect.width; ++c) filled[c] = filled[c] || !bare_cell(cells[c]).empty();
  }
  std::vector<std::size_t> empty;
  for (std::size_t c = 0; c < dialect.width; ++c) {
    if (!filled[c]) empty.push_back(c);
  }
  return empty;
}

/// Settings may stand beside the first rows, in columns that are empty later: those rows are samples as well.
void take_rows_beside_settings(const std::vector<TableLine>& lines, TableDialect& dialect) {
  dialect.empty_columns = empty_columns(lines, dialect);
  if (dialect.empty_columns.empty() || dialect.empty_columns.size() == dialect.width) return;
  while (dialect.first_row > 0) {
    auto cells = cells_of(lines[dialect.first_row - 1].text, dialect.delimiter);
    if (cells.size() != dialect.width) return;
    for (const std::size_t c : dialect.empty_columns) cells[c] = {};
    if (!is_row_of_numbers(cells, dialect.decimal)) return;
    --dialect.first_row;
    ++dialect.beside;
  }
}

}  // namespace

bool is_row_of_numbers(const std::vector<std::string_view>& cells, char decimal) {
  bool any = false;
  for (const std::string_view cell : cells) {
    const CellKind kind = read_cell(cell, decimal).kind;
    if (kind == CellKind::text) return false;
    any |= kind == CellKind::number;
  }
  return any;
}

Result<TableDialect> find_dialect(const std::string& name, const std::vector<TableLine>& lines,
                                  const ReadOptions& options) {
  if (options.delimiter && options.decimal && *options.delimiter == *options.decimal) {
    return failure(Problem::ambiguous, name,
                   fmt::format("'{}' cannot separate both cells and decimals", *options.delimiter),
                   "export it again with another separator");
  }
  const std::vector<TableLine> judged = lines_to_judge(lines);
  std::vector<Candidate> candidates;
  for (const char delimiter : delimiters(options)) {
    for (const char decimal : decimals(options)) {
      if (delimiter != decimal) candidates.push_back(judge(judged, delimiter, decimal));
    }
  }
  std::stable_sort(candidates.begin(), candidates.end(), better);
  Candidate& best = candidates.front();
  if (best.rows == 0) return no_table(name, lines);
  if (best.dialect.width > kMostColumns) {
    return failure(Problem::not_a_capture, name,
                   fmt::format("its rows have {} cells; a capture has at most {}", best.dialect.width, kMostColumns),
                   "export time and channels as columns, one sample in a row");
  }
  if (!options.decimal && best.dialect.delimiter != ',' && both_decimals(judged, best.dialect)) {
    return failure(Problem::ambiguous, name, "some numbers have a decimal point, others a decimal comma",
                   "export it again, or say which is meant in the bench sheet: [file] decimal = \",\"");
  }
  best.dialect.first_row = first_row(lines, best.dialect);
  take_rows_beside_settings(lines, best.dialect);
  if (const std::size_t before = other_width_before(lines, best.dialect); before > 0) {
    return failure(Problem::damaged, fmt::format("{}:{}", name, lines[best.dialect.first_row].number),
                   fmt::format("from here on rows have {} cells where those before have {}", best.dialect.width, before),
                   "repair the file, or export the waveform again");
  }
  if (best.dialect.delimiter == ',' && !options.delimiter) {
    if (const auto why = comma_is_both(lines, best.dialect)) {
      return failure(Problem::ambiguous, name, "a comma may be both separator and decimal sign here: " + *why,
                     "export it with ';' between the cells or with decimal points; if commas only separate, say so in "
                     "the bench sheet: [file] delimiter = \",\"");
    }
  }
  return best.dialect;
}

}  // namespace coilassay

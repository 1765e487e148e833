#include "app/runs/gauge_readings.h"

#include <algorithm>
#include <array>
#include <filesystem>
#include <optional>

#include "app/runs/lot_folder.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

namespace fs = std::filesystem;

std::string trimmed(std::string_view text) {
  const auto blank = [](char c) { return c == ' ' || c == '\r' || c == '"'; };
  while (!text.empty() && blank(text.front())) text.remove_prefix(1);
  while (!text.empty() && blank(text.back())) text.remove_suffix(1);
  return std::string(text);
}

std::vector<std::string> cells_of(std::string_view line, char separator) {
  std::vector<std::string> cells;
  while (true) {
    const std::size_t end = line.find(separator);
    cells.push_back(trimmed(line.substr(0, end)));
    if (end == std::string_view::npos) return cells;
    line.remove_prefix(end + 1);
  }
}

char separator_of(std::string_view header) {
  for (const char c : {'\t', ';'}) {
    if (header.find(c) != std::string_view::npos) return c;
  }
  return ',';
}

constexpr std::array<std::string_view, 4> kColumns{"part", "operator", "trial", "value"};

struct Columns {
  std::array<std::size_t, 4> at{};
  std::string unit;   // of the heading "value [uH]"
  std::size_t count = 0;
};

Result<Columns> columns_of(const std::vector<std::string>& header, const std::string& name) {
  Columns columns;
  columns.count = header.size();
  for (std::size_t c = 0; c < kColumns.size(); ++c) {
    const auto found = std::find_if(header.begin(), header.end(), [&](const std::string& cell) {
      return trimmed(cell.substr(0, cell.find('['))) == kColumns[c];
    });
    if (found == header.end()) {
      return failure(Problem::missing_column, name + ":1", "there is no column '" + std::string(kColumns[c]) + "'",
                     "the first line names the columns part, operator, trial and value");
    }
    columns.at[c] = static_cast<std::size_t>(found - header.begin());
  }
  const std::string& heading = header[columns.at[3]];
  const std::size_t open = heading.find('['), close = heading.find(']');
  if (open != std::string::npos && close != std::string::npos && close > open) columns.unit = heading.substr(open + 1, close - open - 1);
  return columns;
}

std::vector<std::string_view> pieces_of(std::string_view name) {
  std::vector<std::string_view> pieces;
  while (true) {
    const std::size_t dot = name.find('.');
    pieces.push_back(name.substr(0, dot));
    if (dot == std::string_view::npos) return pieces;
    name.remove_prefix(dot + 1);
  }
}

std::optional<GaugeCapture> capture_of(const std::string& file, std::span<const std::string> tests) {
  const std::vector<std::string_view> pieces = pieces_of(file);
  for (std::size_t i = pieces.size() - 1; i-- > 3;) {
    if (std::find(tests.begin(), tests.end(), pieces[i]) == tests.end()) continue;
    GaugeCapture capture;
    capture.test = pieces[i];
    capture.trial = pieces[i - 1];
    capture.operator_name = pieces[i - 2];
    capture.part = file.substr(0, static_cast<std::size_t>(pieces[i - 2].data() - file.data()) - 1);
    const bool whole = !capture.part.empty() && !capture.operator_name.empty() && !capture.trial.empty();
    return whole ? std::optional(capture) : std::nullopt;
  }
  return std::nullopt;
}

bool passed_over(const fs::directory_entry& entry) {
  const std::string name = entry.path().filename().string();
  return name.starts_with('.') || name.ends_with(".toml") || name.ends_with(".json") || !entry.is_regular_file();
}

}  // namespace

Result<std::vector<GaugeReading>> parse_gauge_table(std::string_view text, const std::string& name, Unit unit) {
  if (text.starts_with("\xef\xbb\xbf")) text.remove_prefix(3);
  std::vector<GaugeReading> readings;
  std::optional<Columns> columns;
  char separator = ',';
  std::size_t number = 0;
  while (!text.empty()) {
    const std::size_t end = text.find('\n');
    const std::string_view line = text.substr(0, end);
    text.remove_prefix(end == std::string_view::npos ? text.size() : end + 1);
    ++number;
    if (trimmed(line).empty() || line.front() == '#') continue;
    if (!columns) {
      separator = separator_of(line);
      Result<Columns> found = columns_of(cells_of(line, separator), name);
      if (!found) return failure(found);
      columns = *found;
      continue;
    }
    const std::string place = name + ":" + std::to_string(number);
    const std::vector<std::string> cells = cells_of(line, separator);
    if (cells.size() != columns->count) {
      return failure(Problem::damaged, place,
                     "there are " + std::to_string(cells.size()) + " cells where the heading has " + std::to_string(columns->count),
                     "write one cell for each column");
    }
    const std::string& cell = cells[columns->at[3]];
    const bool bare = parse_plain_number(cell).has_value();
    const auto value = parse_value(bare && !columns->unit.empty() ? cell + " " + columns->unit : cell, unit, place);
    if (!value) return failure(value);
    readings.push_back({cells[columns->at[0]], cells[columns->at[1]], cells[columns->at[2]], value->value});
  }
  if (readings.empty()) {
    return failure(Problem::not_a_capture, name, "there are no readings in it",
                   "the first line names the columns part, operator, trial and value; one reading a line follows");
  }
  return readings;
}

Result<GaugeFolder> read_gauge_folder(const std::string& path, std::span<const std::string> tests) {
  GaugeFolder folder;
  std::error_code error;
  for (fs::directory_iterator each(path, error), end; !error && each != end; each.increment(error)) {
    if (passed_over(*each)) continue;
    const std::string file = each->path().filename().string();
    if (auto capture = capture_of(file, tests)) {
      capture->path = each->path().string();
      folder.captures.push_back(std::move(*capture));
    } else {
      folder.strays.push_back(file);
    }
  }
  if (error) return failure(Problem::unreadable, path, "the folder cannot be read", "give a folder of captures, or a table of readings");
  if (folder.captures.empty()) {
    return failure(Problem::unreadable, path, "there is no capture named PART.OPERATOR.TRIAL.TEST.ENDING in it",
                   "name them like 07.ada.1.ringdown.csv, or give a table of readings");
  }
  // Folders are listed in no order; names decide, so that the same folder is the same study everywhere.
  std::sort(folder.captures.begin(), folder.captures.end(), [](const GaugeCapture& a, const GaugeCapture& b) {
    if (a.part != b.part) return serial_before(a.part, b.part);
    if (a.operator_name != b.operator_name) return serial_before(a.operator_name, b.operator_name);
    if (a.trial != b.trial) return serial_before(a.trial, b.trial);
    return a.path < b.path;
  });
  std::sort(folder.strays.begin(), folder.strays.end());
  return folder;
}

}  // namespace coilassay

#include "acquire/table_meaning.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "acquire/number_scan.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

constexpr std::size_t kRowsLookedAt = 500;

/// The first rows as numbers, column by column.
std::vector<std::vector<double>> first_rows(const std::vector<TableLine>& lines, const TableDialect& dialect) {
  std::vector<std::vector<double>> columns(dialect.width);
  for (std::size_t i = dialect.first_row; i < lines.size() && columns.front().size() < kRowsLookedAt; ++i) {
    auto cells = cells_of(lines[i].text, dialect.delimiter);
    for (const std::size_t c : dialect.empty_columns) {
      if (c < cells.size()) cells[c] = {};  // settings may stand there
    }
    if (cells.size() < dialect.width || !is_row_of_numbers(cells, dialect.decimal)) continue;
    for (std::size_t c = 0; c < dialect.width; ++c) columns[c].push_back(read_cell(cells[c], dialect.decimal).value);
  }
  return columns;
}

bool all_missing(const std::vector<double>& column) {
  return std::all_of(column.begin(), column.end(), [](double v) { return std::isnan(v); });
}

/// The rows before a column first starts again near its first value; all of them when it never falls; none when it falls
/// to somewhere else.
std::size_t first_run(const std::vector<double>& column) {
  for (std::size_t i = 1; i < column.size(); ++i) {
    if (column[i] >= column[i - 1]) continue;
    const double step = (column[i - 1] - column.front()) / static_cast<double>(std::max<std::size_t>(i - 1, 1));
    // Stamps rounded to few digits fall back by less than a step here and there.
    if (column[i - 1] - column[i] < step && column[i] > column.front()) continue;
    return column[i] <= column.front() + 2 * step ? i : 0;
  }
  return std::any_of(column.begin(), column.end(), [](double v) { return std::isnan(v); }) ? 0 : column.size();
}

/// Mean step of a column that rises; 0 when it does not.
double rising_step(const std::vector<double>& column) {
  const std::size_t run = first_run(column);
  return run < 2 ? 0 : (column[run - 1] - column.front()) / static_cast<double>(run - 1);
}

/// Many rows may be rounded to few digits; a handful must rise in exact steps before that alone makes them time.
bool rises_evenly(const std::vector<double>& column, bool has_name) {
  const double step = rising_step(column);
  const std::size_t run = first_run(column);
  if (!(step > 0) || run < 3 || (has_name && run < 8)) return false;
  const double allowed = run >= 20 && !has_name ? 0.6 : 0.02;
  for (std::size_t i = 0; i < run; ++i) {
    if (std::fabs(column[i] - column.front() - static_cast<double>(i) * step) > allowed * step) return false;
  }
  return true;
}

bool counts_rows(const std::vector<double>& column) {
  for (std::size_t i = 0; i < column.size(); ++i) {
    if (column[i] != std::floor(column[i])) return false;
    // Segments count anew.
    if (i > 0 && column[i] - column[i - 1] != 1 && !(i > 1 && column[i] == column.front())) return false;
  }
  return column.size() >= 2;
}

class ColumnJudge {
 public:
  ColumnJudge(const std::vector<TableLine>& lines, const TableDialect& dialect, const TableHeader& header)
      : dialect_(dialect), header_(header), values_(first_rows(lines, dialect)) {}

  const std::vector<double>& values(std::size_t c) const { return values_[c]; }
  bool empty(std::size_t c) const { return header_.columns[c].left_out || all_missing(values_[c]); }

  /// Nothing but blanks in the first rows, and no name that promises a channel (settings may be named there).
  bool left_blank(std::size_t c) const {
    if (std::find(dialect_.empty_columns.begin(), dialect_.empty_columns.end(), c) == dialect_.empty_columns.end()) return false;
    const std::string& name = header_.columns[c].name;
    return dialect_.beside > 0 || name.empty() || header_.settings.contains(name);
  }

  bool is_index(std::size_t c) const {
    const std::string& name = header_.columns[c].name;
    if (!counts_rows(values_[c])) return false;
    if (names_index(name)) return true;
    // "X" above 0, 1, 2 counts rows unless a unit says that it is time.
    return c == 0 && !header_.columns[c].unit && (name.empty() || names_time(name)) && values_.size() > 1 &&
           (name.empty() || lower_case(name).starts_with('x'));
  }

  std::optional<std::size_t> time_column() const {
    const std::size_t width = values_.size();
    for (std::size_t c = 0; c < width; ++c) {
      const auto& unit = header_.columns[c].unit;
      if (unit && unit->unit == Unit::second && !empty(c) && !is_index(c)) return c;
    }
    for (std::size_t c = 0; c < width; ++c) {
      const auto& unit = header_.columns[c].unit;
      if (!unit && names_time(header_.columns[c].name) && !empty(c) && !is_index(c) && rising_step(values_[c]) > 0) return c;
    }
    // Nothing says it: the first column that is no row number, if it rises evenly.
    for (std::size_t c = 0; c < width; ++c) {
      if (empty(c) || is_index(c)) continue;
      const bool even = !header_.columns[c].unit && rises_evenly(values_[c], !header_.columns[c].name.empty());
      if (even && others_hold_samples(c)) return c;
      break;
    }
    return std::nullopt;
  }

 private:
  bool others_hold_samples(std::size_t time) const {
    for (std::size_t c = 0; c < values_.size(); ++c) {
      if (c != time && !empty(c) && !is_index(c)) return true;
    }
    return false;
  }

  const TableDialect& dialect_;
  const TableHeader& header_;
  std::vector<std::vector<double>> values_;
};

Finding contradiction(std::string message, const std::string& about, double figure, Unit unit) {
  return {"header_contradicts", Severity::note, std::move(message), about, figure, unit};
}

std::string_view unit_name(int shift) {
  return shift == 0 ? "s" : shift == -3 ? "ms" : shift == -6 ? "us" : shift == -9 ? "ns" : "ps";
}

/// Time in a unit that the interval contradicts: the interval and the stamps agree for another power of a thousand.
int time_shift(const std::string& name, const ColumnHeading& heading, const std::vector<double>& stamps,
               const std::optional<double>& interval_s, std::vector<Finding>& findings) {
  const int stated = heading.unit ? heading.unit->exponent : 0;
  const double step = rising_step(stamps);
  if (!interval_s || !(step > 0)) return stated;
  for (const int shift : {0, -3, -6, -9, -12}) {
    const double ratio = step * std::pow(10.0, shift) / *interval_s;
    if (std::fabs(ratio - 1) > 0.02 || shift == stated) continue;
    findings.push_back(contradiction(
        fmt::format("the heading '{}' {}, but the stated sample interval of {} s fits the stamps only in {}: that was taken",
                    shown(name, 60), heading.unit ? fmt::format("gives time in {}", unit_name(stated)) : "names no unit", *interval_s,
                    unit_name(shift)),
        name, *interval_s, Unit::second));
    return shift;
  }
  return stated;
}

void check_angle(const ChannelMeaning& channel, const std::vector<double>& values, std::vector<Finding>& findings) {
  if (channel.unit_stated || !names_angle(channel.name)) return;
  double largest = 0;
  for (const double v : values) {
    if (!std::isnan(v)) largest = std::max(largest, std::fabs(v));
  }
  findings.push_back({"angle_unit", largest <= 3.2 ? Severity::caution : Severity::note,
                      fmt::format("column '{}' looks like an angle but its heading names no unit; its first values reach {}{}",
                                  shown(channel.name, 60), largest,
                                  largest <= 3.2 ? ": radians or small degrees" : ": degrees"),
                      channel.name, largest, Unit::one});
}

/// A preamble that speaks of one channel speaks of the only one.
void name_the_one_channel(const TableHeader& header, TableMeaning& meaning) {
  ChannelMeaning& channel = meaning.channels.front();
  if (!header.source.empty() && header.columns[channel.column - 1].name.empty()) channel.name = header.source;
  if (channel.unit_stated || !header.vertical_unit || header.vertical_unit->degrees || header.vertical_unit->decibels) return;
  channel.unit = *header.vertical_unit;
  channel.unit_stated = true;
  meaning.layout.columns[channel.column - 1].shift = channel.unit.exponent;
}

}  // namespace

Result<TableMeaning> understand_columns(const std::string& name, const std::vector<TableLine>& lines,
                                        const TableDialect& dialect, const TableHeader& header, const ReadOptions& options,
                                        bool is_sweep) {
  const ColumnJudge judge(lines, dialect, header);
  TableMeaning meaning;
  meaning.layout.delimiter = dialect.delimiter;
  meaning.layout.decimal = dialect.decimal;
  meaning.interval_s = options.sample_interval_s ? options.sample_interval_s : header.interval_s;
  meaning.start_s = header.start_s;
  meaning.count = header.count;
  meaning.segment = header.segment;

  const auto time = is_sweep ? std::nullopt : judge.time_column();
  for (std::size_t c = 0; c < dialect.width; ++c) {
    const ColumnHeading& heading = header.columns[c];
    ColumnPlan plan;
    if (heading.left_out) {
      plan.stored = false;
    } else if (time == c) {
      meaning.time = meaning.layout.stored();
      plan.shift = time_shift(heading.name, heading, judge.values(c), meaning.interval_s, meaning.findings);
    } else if (judge.left_blank(c) || (judge.is_index(c) && !is_sweep)) {
      plan.stored = false;
    } else {
      ChannelMeaning channel;
      channel.name = heading.name.empty() ? fmt::format("column {}", c + 1) : heading.name;
      channel.column = c + 1;
      if (heading.unit && !heading.unit->degrees && !heading.unit->decibels) {
        channel.unit = *heading.unit;
        channel.unit_stated = true;
        plan.shift = heading.unit->exponent;
      }
      for (const std::string& key : {std::string(), channel.name}) {
        if (const auto found = header.full_scale.find(key); found != header.full_scale.end()) channel.full_scale = found->second;
      }
      if (const auto found = header.resolution.find(channel.name); found != header.resolution.end()) {
        channel.resolution = found->second;
      }
      if (!heading.unit && !is_sweep) check_angle(channel, judge.values(c), meaning.findings);
      meaning.channels.push_back(channel);
    }
    meaning.layout.columns.push_back(plan);
  }
  if (meaning.channels.size() == 1) name_the_one_channel(header, meaning);
  if (meaning.channels.empty()) {
    return failure(Problem::not_a_capture, name,
                   time ? "it has a column of time but none of samples" : "it has row numbers but no column of samples",
                   "export at least one channel");
  }
  return meaning;
}

}  // namespace coilassay

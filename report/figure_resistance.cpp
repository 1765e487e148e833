#include "report/figure_resistance.h"

#include <algorithm>
#include <cmath>
#include <string_view>

namespace coilassay {

namespace {

using Mark = FigureSeries::Mark;

const Table* find_table(const Measurement& m, std::string_view name) {
  const auto found = std::find_if(m.tables.begin(), m.tables.end(), [name](const Table& t) { return t.name == name; });
  return found == m.tables.end() ? nullptr : &*found;
}

/// A handful of readings wants to be seen one by one; thousands are a cloud.
FigureSeries points_of(const char* label, const Table& table) {
  constexpr std::size_t kFew = 200;
  FigureSeries series{Mark::dots, label, table.columns[0].values, table.columns[1].values, {}};
  if (series.y.size() <= kFew) {
    series.mark = Mark::error_bars;
    series.y2.assign(series.y.size(), std::nan(""));
  }
  return series;
}

FigureSeries series_of(Mark mark, const char* label, const Table& table, std::size_t y) {
  return {mark, label, table.columns[0].values, table.columns[y].values, {}};
}

}  // namespace

std::vector<FigurePanel> resistance_panels(const Measurement& m) {
  std::vector<FigurePanel> panels;
  const Table* readings = find_table(m, "readings");
  const Table* line = find_table(m, "line");
  const Table* order = find_table(m, "order");
  if (readings == nullptr || line == nullptr || order == nullptr) return panels;

  FigurePanel slope{.x_label = "current", .y_label = "voltage", .x_unit = Unit::ampere, .y_unit = Unit::volt, .height = 1.3};
  slope.series.push_back(series_of(Mark::line, "line", *line, 1));
  slope.series.push_back(points_of("readings", *readings));
  panels.push_back(std::move(slope));

  const bool timed = order->columns[0].unit == Unit::second;
  FigurePanel drift{.x_label = timed ? "time of the reading" : "number of the reading",
                    .y_label = "resistance",
                    .x_unit = order->columns[0].unit,
                    .y_unit = Unit::ohm};
  drift.series.push_back(series_of(Mark::line, "resistance and its trend", *order, 2));
  drift.series.push_back(points_of("readings without the offset", *order));
  panels.push_back(std::move(drift));
  return panels;
}

}  // namespace coilassay

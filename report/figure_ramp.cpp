#include "report/figure_ramp.h"

#include <cmath>
#include <string_view>
#include <utility>

namespace coilassay {

namespace {

using Mark = FigureSeries::Mark;

const std::vector<double>* find_column(const Measurement& m, std::string_view table, std::string_view name) {
  for (const Table& each : m.tables) {
    if (each.name != table) continue;
    for (const TableColumn& column : each.columns) {
      if (column.name == name && !column.values.empty()) return &column.values;
    }
  }
  return nullptr;
}

void add_over_time(std::vector<FigurePanel>& panels, const Measurement& m, const char* label, Unit unit,
                   std::string_view table, std::string_view column) {
  const auto* time = find_column(m, table, "time_s");
  const auto* values = find_column(m, table, column);
  if (time == nullptr || values == nullptr) return;
  FigurePanel panel{.x_label = "time", .y_label = label, .x_unit = Unit::second, .y_unit = unit};
  panel.series.push_back({unit == Unit::weber ? Mark::line : Mark::trace, "", *time, *values, {}});
  if (m.model && m.model->window_s) panel.x_rules = {m.model->window_s->first, m.model->window_s->second};
  panels.push_back(std::move(panel));
}

/// Where the estimate says that the inductance has dropped so far.
void add_drops(FigurePanel& panel, const Measurement& m) {
  const Estimate* start = m.find("L_0");
  if (start == nullptr) return;
  FigureSeries points{Mark::error_bars, "10, 20 and 30 % below L_0", {}, {}, {}};
  for (const auto& [symbol, drop] : {std::pair{"I_sat_10", 0.1}, std::pair{"I_sat_20", 0.2}, std::pair{"I_sat_30", 0.3}}) {
    const Estimate* found = m.find(symbol);
    if (found == nullptr) continue;
    points.x.push_back(found->quantity.value);
    points.y.push_back((1 - drop) * start->quantity.value);
    points.y2.push_back(std::nan(""));
  }
  if (!points.x.empty()) panel.series.push_back(std::move(points));
}

}  // namespace

std::vector<FigurePanel> ramp_panels(const Measurement& m) {
  std::vector<FigurePanel> panels;
  add_over_time(panels, m, "voltage", Unit::volt, "trace_ramp", "voltage_V");
  add_over_time(panels, m, "current", Unit::ampere, "trace_ramp", "current_A");
  add_over_time(panels, m, "flux", Unit::weber, "trace_flux", "flux_Wb");
  const auto* current = find_column(m, "curve", "current_A");
  const auto* inductance = find_column(m, "curve", "incremental_H");
  const auto* half = find_column(m, "curve", "incremental_U_H");
  if (current == nullptr || inductance == nullptr || half == nullptr) return panels;
  FigurePanel panel{.x_label = "current", .y_label = "inductance", .x_unit = Unit::ampere, .y_unit = Unit::henry, .height = 2};
  FigureSeries band{Mark::band, "95 % band", *current, *inductance, *inductance};
  for (std::size_t i = 0; i < band.y.size(); ++i) {
    band.y[i] -= (*half)[i];
    band.y2[i] += (*half)[i];
  }
  panel.series.push_back(std::move(band));
  panel.series.push_back({Mark::line, "dflux/di", *current, *inductance, {}});
  add_drops(panel, m);
  panels.push_back(std::move(panel));
  return panels;
}

}  // namespace coilassay

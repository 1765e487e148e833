#include "report/figure.h"

#include <algorithm>
#include <array>
#include <cmath>

#include "base/outside_text.h"
#include "report/figure_coupling.h"
#include "report/figure_resistance.h"
#include "report/figure_ramp.h"
#include "report/figure_sine.h"
#include "report/figure_sweep.h"
#include "report/wording.h"

namespace coilassay {

namespace {

using Mark = FigureSeries::Mark;

const Table* find_table(const Measurement& m, std::string_view name) {
  for (const Table& each : m.tables) {
    if (each.name == name) return &each;
  }
  return nullptr;
}

/// The column, or nullptr: a figure shows what is there.
const std::vector<double>* find_column(const Table* table, std::string_view name) {
  if (table == nullptr) return nullptr;
  for (const TableColumn& each : table->columns) {
    if (each.name == name && !each.values.empty()) return &each.values;
  }
  return nullptr;
}

void add_series(FigurePanel& panel, Mark mark, std::string label, const Table* table, std::string_view x,
                std::string_view y) {
  const auto* xs = find_column(table, x);
  const auto* ys = find_column(table, y);
  if (xs != nullptr && ys != nullptr) panel.series.push_back({mark, std::move(label), *xs, *ys, {}});
}

FigurePanel capture_panel(const Measurement& m) {
  FigurePanel panel{
      .x_label = "time", .y_label = "voltage", .x_unit = Unit::second, .y_unit = Unit::volt, .height = 1.7};
  const Table* fit = find_table(m, "trace_fit");
  add_series(panel, Mark::trace, "capture", find_table(m, "trace_capture"), "time_s", "voltage_V");
  add_series(panel, Mark::line, "fit", fit, "time_s", "fit_V");
  add_series(panel, Mark::dashes, "envelope", fit, "time_s", "envelope_high_V");
  add_series(panel, Mark::dashes, "", fit, "time_s", "envelope_low_V");
  if (m.model && m.model->window_s && !panel.series.empty()) {
    panel.x_rules = {m.model->window_s->first, m.model->window_s->second};
    panel.rules_label = "window of the fit";
  }
  return panel;
}

FigurePanel residual_panel(const Measurement& m) {
  FigurePanel panel{.x_label = "time", .y_label = "capture - fit", .x_unit = Unit::second, .y_unit = Unit::volt};
  add_series(panel, Mark::dots, "", find_table(m, "trace_residual"), "time_s", "residual_V");
  return panel;
}

/// 1/omega^2 is a squared time: written in (µs)² or whichever square keeps the numbers readable.
struct SquaredTime {
  double per_si;
  std::string_view unit;
};
SquaredTime squared_time_for(const std::vector<double>& values) {
  double largest = 0;
  for (double value : values) largest = std::fmax(largest, std::fabs(value));
  constexpr std::array kChoices = {SquaredTime{1, "s²"}, SquaredTime{1e6, "ms²"}, SquaredTime{1e12, "µs²"},
                                   SquaredTime{1e18, "ns²"}};
  for (const SquaredTime& each : kChoices) {
    if (largest * each.per_si >= 0.05) return each;  // short tick labels: 0.15 µs² rather than 150000 ns²
  }
  return kChoices.back();
}

FigurePanel line_panel(const Table& table) {
  FigurePanel panel{.x_label = "capacitance added", .x_unit = Unit::farad, .height = 1.4};
  add_series(panel, Mark::line, "line", &table, "capacitance_F", "fit_s2");
  add_series(panel, Mark::error_bars, "captures with standard uncertainty", &table, "capacitance_F",
             "inverse_omega_squared_s2");
  const auto* u = find_column(&table, "u_inverse_s2");
  std::vector<double> all;
  for (const FigureSeries& each : panel.series) all.insert(all.end(), each.y.begin(), each.y.end());
  const SquaredTime scale = squared_time_for(all);
  panel.y_label = "1/(2πf₀)² (" + std::string(scale.unit) + ")";
  for (FigureSeries& each : panel.series) {
    if (each.mark == Mark::error_bars) {
      each.y2 = u != nullptr ? *u : std::vector<double>(each.y.size(), std::nan(""));
    }
    for (double& y : each.y) y *= scale.per_si;
    for (double& y : each.y2) y *= scale.per_si;
  }
  return panel;
}

}  // namespace

Figure figure_of(const Measurement& m) {
  Figure figure;
  figure.title = test_in_words(m.test);
  if (m.sources.size() == 1) figure.title += ": " + shown(m.sources.front().source.name, 80);
  if (m.sources.size() > 1) figure.title += ": " + std::to_string(m.sources.size()) + " files";
  if (m.test == "ringdown") {
    for (FigurePanel panel : {capture_panel(m), residual_panel(m)}) {
      if (!panel.series.empty()) figure.panels.push_back(std::move(panel));
    }
    if (const Table* line = find_table(m, "line")) {
      FigurePanel panel = line_panel(*line);
      if (!panel.series.empty()) figure.panels.push_back(std::move(panel));
    }
  }
  if (m.test == "sine") figure.panels = sine_panels(m);
  if (m.test == "coupling") figure.panels = coupling_panels(m);
  if (m.test == "ramp") figure.panels = ramp_panels(m);
  if (m.test == "sweep") figure.panels = sweep_panels(m);
  if (m.test == "resistance") figure.panels = resistance_panels(m);
  return figure;
}

}  // namespace coilassay

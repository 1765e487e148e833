#include "report/figure_sine.h"

#include <algorithm>
#include <cmath>
#include <string>
#include <string_view>
#include <utility>

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

FigurePanel over_time(std::string label, Unit unit, double height) {
  return {.x_label = "time", .y_label = std::move(label), .x_unit = Unit::second, .y_unit = unit, .height = height};
}

/// x column of the points that varies: the bias when it is stated, else the frequency.
std::string_view abscissa(const Table& points) {
  const auto* bias = find_column(&points, "bias_A");
  const bool stated = bias != nullptr && std::any_of(bias->begin(), bias->end(), [](double b) { return std::isfinite(b); });
  if (stated) return "bias_A";
  const auto* f = find_column(&points, "frequency_Hz");
  if (f == nullptr) return "frequency_Hz";
  // One frequency throughout: what changes is the level.
  const auto [low, high] = std::minmax_element(f->begin(), f->end());
  return *high < 1.01 * *low ? "level_A" : "frequency_Hz";
}

FigurePanel points_panel(const Table& points, std::string label, Unit unit, std::string_view y, std::string_view half) {
  const std::string_view x = abscissa(points);
  FigurePanel panel{.x_label = x == "bias_A" ? "bias" : x == "level_A" ? "current (r.m.s.)" : "frequency",
                    .y_label = std::move(label),
                    .x_unit = x == "frequency_Hz" ? Unit::hertz : Unit::ampere,
                    .y_unit = unit,
                    .x_log = false,
                    .height = 1.4};
  const auto* f = find_column(&points, x);
  if (x == "frequency_Hz" && f != nullptr && !f->empty()) {
    const auto [low, high] = std::minmax_element(f->begin(), f->end());
    panel.x_log = *low > 0 && *high > 10 * *low;
  }
  add_series(panel, Mark::error_bars, "captures with 95 % intervals", &points, x, y);
  const auto* bars = find_column(&points, half);
  for (FigureSeries& each : panel.series) {
    each.y2 = bars != nullptr ? *bars : std::vector<double>(each.y.size(), std::nan(""));
  }
  return panel;
}

FigurePanel impedance_panel(const Measurement& m) {
  FigurePanel panel{.x_label = "resistance", .y_label = "reactance", .x_unit = Unit::ohm, .y_unit = Unit::ohm, .height = 1.2};
  const Table* z = find_table(m, "trace_impedance");
  const auto* r = find_column(z, "resistance_ohm");
  const auto* x = find_column(z, "reactance_ohm");
  if (r == nullptr || x == nullptr || r->size() < 3) return panel;
  panel.series.push_back({Mark::dashes, "R and X", *r, *x, {}});
  panel.series.push_back({Mark::line, "Z", {(*r)[0], (*r)[2]}, {(*x)[0], (*x)[2]}, {}});
  return panel;
}

}  // namespace

std::vector<FigurePanel> sine_panels(const Measurement& m) {
  std::vector<FigurePanel> panels;
  const auto keep = [&](FigurePanel panel) {
    if (!panel.series.empty()) panels.push_back(std::move(panel));
  };
  if (const Table* points = find_table(m, "points")) {
    keep(points_panel(*points, "L_s", Unit::henry, "inductance_H", "inductance_U_H"));
    keep(points_panel(*points, "R_s", Unit::ohm, "resistance_ohm", "resistance_U_ohm"));
    return panels;
  }
  const Table* capture = find_table(m, "trace_capture");
  const Table* fit = find_table(m, "trace_fit");
  const Table* left = find_table(m, "trace_residual");
  FigurePanel volts = over_time("voltage", Unit::volt, 1.4);
  add_series(volts, Mark::trace, "capture", capture, "time_s", "voltage_V");
  add_series(volts, Mark::line, "fit", fit, "time_s", "fit_V");
  keep(std::move(volts));
  FigurePanel amps = over_time("current", Unit::ampere, 1.4);
  add_series(amps, Mark::trace, "capture", capture, "time_s", "current_A");
  add_series(amps, Mark::line, "fit", fit, "time_s", "fit_A");
  keep(std::move(amps));
  FigurePanel left_v = over_time("voltage - fit", Unit::volt, 0.8);
  add_series(left_v, Mark::dots, "", left, "time_s", "residual_V");
  keep(std::move(left_v));
  FigurePanel left_i = over_time("current - fit", Unit::ampere, 0.8);
  add_series(left_i, Mark::dots, "", left, "time_s", "residual_A");
  keep(std::move(left_i));
  keep(impedance_panel(m));
  return panels;
}

}  // namespace coilassay

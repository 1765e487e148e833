#include "report/figure_coupling.h"

#include <algorithm>
#include <cmath>
#include <string>
#include <string_view>

#include "analysis/coupling_circuit.h"

namespace coilassay {

namespace {

using Mark = FigureSeries::Mark;

const Table* find_table(const Measurement& m, std::string_view name) {
  for (const Table& each : m.tables) {
    if (each.name == name) return &each;
  }
  return nullptr;
}

FigurePanel over_frequency(std::string label, Unit unit, double height) {
  return {.x_label = "frequency", .y_label = std::move(label), .x_unit = Unit::hertz, .y_unit = unit, .x_log = true, .height = height};
}

void add_items(FigurePanel& panel, const Measurement& m, std::initializer_list<CouplingItem> items) {
  bool further = false;   // the second curve of a panel is dashed, so that the key tells them apart
  for (const CouplingItem item : items) {
    const Table* table = find_table(m, "trace_" + std::string(name(item)));
    if (table == nullptr) continue;
    panel.series.push_back({Mark::trace, further ? "" : "measured", table->columns[0].values, table->columns[1].values, {}});
    panel.series.push_back({further ? Mark::dashes : Mark::line, std::string(in_words(item)), table->columns[0].values, table->columns[2].values, {}});
    further = true;
  }
}

}  // namespace

std::vector<FigurePanel> coupling_panels(const Measurement& m) {
  using enum CouplingItem;
  std::vector<FigurePanel> panels;
  const auto keep = [&](FigurePanel panel) {
    if (!panel.series.empty()) panels.push_back(std::move(panel));
  };
  FigurePanel first = over_frequency("L of the primary", Unit::henry, 1.2);
  add_items(first, m, {primary_open, primary_short});
  keep(std::move(first));
  FigurePanel second = over_frequency("L of the secondary", Unit::henry, 1.2);
  add_items(second, m, {secondary_open, secondary_short});
  keep(std::move(second));
  FigurePanel series = over_frequency("L in series", Unit::henry, 1.2);
  add_items(series, m, {aiding, opposing});
  keep(std::move(series));
  FigurePanel mutual = over_frequency("M", Unit::henry, 1.2);
  add_items(mutual, m, {mutual_21, mutual_12});
  keep(std::move(mutual));
  FigurePanel ratios = over_frequency("voltage ratio", Unit::one, 1);
  add_items(ratios, m, {ratio_forward, ratio_reverse});
  keep(std::move(ratios));
  FigurePanel k = over_frequency("k", Unit::one, 1);
  if (const Table* seen = find_table(m, "trace_k")) {
    k.series.push_back({Mark::dots, "frequency by frequency", seen->columns[0].values, seen->columns[1].values, {}});
    if (const Table* fit = find_table(m, "trace_k_fit")) {
      k.series.push_back({Mark::line, "joint solution", fit->columns[0].values, fit->columns[1].values, {}});
    }
  }
  keep(std::move(k));
  if (const Table* inputs = find_table(m, "trace_inputs")) {
    FigurePanel residuals{.x_label = "input, in the order of the table", .y_label = "residual (u)", .height = 1};
    residuals.series.push_back({Mark::error_bars, "measured less computed, in its own u", inputs->columns[0].values, inputs->columns[1].values,
                                std::vector<double>(inputs->columns[0].values.size(), 2.0)});
    keep(std::move(residuals));
  }
  return panels;
}

}  // namespace coilassay

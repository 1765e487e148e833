#include "report/figure_sweep.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <string>
#include <string_view>
#include <utility>

namespace coilassay {

namespace {

using Mark = FigureSeries::Mark;
constexpr double kHighest = 2;   // of L_s over L: nearer to the resonance the curve leaves the paper

class Traces {
 public:
  explicit Traces(const Measurement& m) : m_(m) {}

  /// The column, or nothing: a figure shows what is there.
  std::vector<double> column(std::string_view table, std::string_view name) const {
    for (const Table& each : m_.tables) {
      if (each.name != table) continue;
      for (const TableColumn& c : each.columns) {
        if (c.name == name) return c.values;
      }
    }
    return {};
  }

  FigurePanel panel(std::string label, Unit unit, double height) const {
    FigurePanel made{.x_label = "frequency", .y_label = std::move(label), .x_unit = Unit::hertz, .y_unit = unit, .x_log = true,
                     .height = height};
    if (const Estimate* f_r = m_.find("f_r")) {
      made.x_rules = {f_r->quantity.value};
      made.rules_label = "self-resonance";
    }
    return made;
  }

  void add(FigurePanel& panel, Mark mark, std::string label, std::string_view table, std::string_view y,
           std::string_view y2 = {}) const {
    std::vector<double> xs = column(table, "frequency_Hz"), ys = column(table, y), upper;
    if (!y2.empty()) upper = column(table, y2);
    const bool any = std::any_of(ys.begin(), ys.end(), [](double v) { return std::isfinite(v); });
    if (xs.empty() || !any) return;
    panel.series.push_back({mark, std::move(label), std::move(xs), std::move(ys), std::move(upper)});
  }

  const Measurement& measurement() const { return m_; }

 private:
  const Measurement& m_;
};

/// Values beyond the limits become gaps.
void keep_between(FigurePanel& panel, double low, double high) {
  for (FigureSeries& each : panel.series) {
    for (std::size_t i = 0; i < each.y.size(); ++i) {
      const bool second = i < each.y2.size();
      if (each.y[i] > low && each.y[i] < high && (!second || (each.y2[i] > low && each.y2[i] < high))) continue;
      each.y[i] = std::nan("");
      if (second) each.y2[i] = std::nan("");
    }
  }
}

FigurePanel size_panel(const Traces& traces) {
  FigurePanel panel = traces.panel("|Z|", Unit::ohm, 1.4);
  panel.y_log = true;
  traces.add(panel, Mark::trace, "measured", "trace_sweep", "impedance_ohm");
  traces.add(panel, Mark::line, "circuit", "trace_model", "impedance_ohm");
  traces.add(panel, Mark::dots, "left out", "trace_sweep", "left_out_ohm");
  return panel;
}

FigurePanel angle_panel(const Traces& traces) {
  FigurePanel panel = traces.panel("angle (°)", Unit::one, 1);
  traces.add(panel, Mark::trace, "measured", "trace_sweep", "phase_rad");
  traces.add(panel, Mark::line, "circuit", "trace_model", "phase_rad");
  for (FigureSeries& each : panel.series) {
    for (double& y : each.y) y *= 180 / std::numbers::pi;
  }
  return panel;
}

FigurePanel inductance_panel(const Traces& traces) {
  FigurePanel panel = traces.panel("L_s", Unit::henry, 1.2);
  traces.add(panel, Mark::band, "95 %", "trace_model", "inductance_low_H", "inductance_high_H");
  traces.add(panel, Mark::dots, "measured", "trace_sweep", "inductance_H");
  traces.add(panel, Mark::line, "circuit", "trace_model", "inductance_H");
  if (const Estimate* l = traces.measurement().find("L")) keep_between(panel, 0, kHighest * l->quantity.value);
  return panel;
}

FigurePanel resistance_panel(const Traces& traces) {
  FigurePanel panel = traces.panel("R_s", Unit::ohm, 1.2);
  panel.y_log = true;
  traces.add(panel, Mark::band, "95 %", "trace_model", "resistance_low_ohm", "resistance_high_ohm");
  traces.add(panel, Mark::dots, "measured", "trace_sweep", "resistance_ohm");
  traces.add(panel, Mark::line, "circuit", "trace_model", "resistance_ohm");
  keep_between(panel, 0, HUGE_VAL);
  return panel;
}

FigurePanel quality_panel(const Traces& traces) {
  FigurePanel panel = traces.panel("Q", Unit::one, 1);
  traces.add(panel, Mark::line, "circuit", "trace_model", "quality");
  // A point whose resistance is hidden by noise has any Q: the circuit's curve says how much paper is wanted.
  double highest = 0;
  for (const FigureSeries& each : panel.series) {
    for (const double y : each.y) highest = std::isfinite(y) ? std::fmax(highest, y) : highest;
  }
  traces.add(panel, Mark::dots, "measured", "trace_sweep", "quality");
  keep_between(panel, 0, highest > 0 ? 1.5 * highest : HUGE_VAL);
  return panel;
}

FigurePanel causality_panel(const Traces& traces) {
  FigurePanel panel = traces.panel("causality (%)", Unit::one, 0.9);
  panel.x_rules.clear();
  panel.rules_label.clear();
  traces.add(panel, Mark::dots, "size", "trace_causality", "real");
  traces.add(panel, Mark::dots, "angle", "trace_causality", "imaginary");
  for (FigureSeries& each : panel.series) {
    for (double& y : each.y) y *= 100;
  }
  return panel;
}

}  // namespace

std::vector<FigurePanel> sweep_panels(const Measurement& m) {
  const Traces traces(m);
  std::vector<FigurePanel> panels;
  for (FigurePanel panel : {size_panel(traces), angle_panel(traces), inductance_panel(traces), resistance_panel(traces),
                            quality_panel(traces), causality_panel(traces)}) {
    if (!panel.series.empty()) panels.push_back(std::move(panel));
  }
  return panels;
}

}  // namespace coilassay

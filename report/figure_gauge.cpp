#include "report/figure_gauge.h"

#include <algorithm>
#include <cmath>

#include "base/outside_text.h"

namespace coilassay {

namespace {

using Mark = FigureSeries::Mark;

constexpr std::size_t kPanelsOfOperators = 6;   // more would be too small to be read

/// Large points, one for each value.
FigureSeries points(std::string label) { return {Mark::error_bars, std::move(label), {}, {}, {}}; }

void add_point(FigureSeries& series, double x, double y) {
  series.x.push_back(x);
  series.y.push_back(y);
  series.y2.push_back(std::nan(""));
}

/// Every trial of one operator over the parts, with the mean of each part over all operators as a line to compare with.
FigurePanel panel_of_operator(const GaugeRecord& record, std::size_t j) {
  const GaugeStudy& study = record.study;
  const std::size_t o = study.operators.size(), r = study.trials.size();
  FigurePanel panel{.x_label = "part, in the order of the study", .y_label = "operator " + shown(study.operators[j], 20), .y_unit = record.unit};
  FigureSeries means{Mark::line, j == 0 ? "mean of the part, all operators" : "", {}, {}, {}}, trials = points(j == 0 ? "trials" : "");
  for (std::size_t i = 0; i < study.parts.size(); ++i) {
    double mean = 0;
    for (std::size_t c = 0; c < o * r; ++c) mean += study.values[i * o * r + c] / static_cast<double>(o * r);
    means.x.push_back(static_cast<double>(i + 1));
    means.y.push_back(mean);
    for (std::size_t k = 0; k < r; ++k) add_point(trials, static_cast<double>(i + 1), study.values[(i * o + j) * r + k]);
  }
  panel.series = {std::move(means), std::move(trials)};
  return panel;
}

/// Deviations with their intervals as upright lines.
FigurePanel components_panel(const GaugeRecord& record) {
  FigurePanel panel{.x_label = "1 repeatability, 2 reproducibility, 3 gauge, 4 part", .y_label = "deviation", .y_unit = record.unit, .height = 1.3};
  FigureSeries intervals{Mark::line, "95 % interval", {}, {}, {}}, values = points("standard deviation");
  double at = 0;
  for (const char* name : {"repeatability", "reproducibility", "gauge", "part"}) {
    const GaugeComponent& c = record.study.component(name);
    at += 1;
    if (!(c.high > 0)) continue;
    intervals.x.insert(intervals.x.end(), {at, at, at});
    intervals.y.insert(intervals.y.end(), {c.low, c.high, std::nan("")});
    add_point(values, at, c.sigma);
  }
  panel.series = {std::move(intervals), std::move(values)};
  return panel;
}

}  // namespace

Figure figure_of(const GaugeRecord& record) {
  Figure figure;
  figure.title = "Gauge study" + (record.quantity.empty() ? "" : " of " + record.quantity);
  for (std::size_t j = 0; j < std::min(record.study.operators.size(), kPanelsOfOperators); ++j) {
    figure.panels.push_back(panel_of_operator(record, j));
  }
  figure.panels.push_back(components_panel(record));
  return figure;
}

}  // namespace coilassay

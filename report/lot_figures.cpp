#include "report/lot_figures.h"

#include <algorithm>
#include <cmath>
#include <numeric>

#include "inspection/capability.h"
#include "report/wording.h"

namespace coilassay {

namespace {

using Mark = FigureSeries::Mark;

constexpr double kLeastBins = 6, kMostBins = 40;

struct Values {
  std::vector<double> x, y, half;  // place in the lot counted from 1, value, half-width
};

Values values_of(const LotRecord& lot, std::size_t limit) {
  Values values;
  for (std::size_t i = 0; i < lot.units.size(); ++i) {
    const auto& limits = lot.units[i].verdict.limits;
    if (limit >= limits.size() || !limits[limit].value || limits[limit].verdict == Verdict::not_comparable) continue;
    values.x.push_back(static_cast<double>(i + 1));
    values.y.push_back(*limits[limit].value);
    values.half.push_back(limits[limit].U.value_or(std::nan("")));
  }
  return values;
}

FigureSeries level(Mark mark, std::string label, double from, double to, double y) {
  return {mark, std::move(label), {from, to}, {y, y}, {}};
}

void add_limits(FigurePanel& panel, const Limit& limit, double last) {
  bool labelled = false;
  for (const auto& edge : {limit.min, limit.max}) {
    if (!edge) continue;
    panel.series.push_back(level(Mark::dashes, labelled ? "" : "limits", 0, last, *edge));
    labelled = true;
  }
}

FigurePanel sorted_panel(const LotRecord& lot, std::size_t index, const Values& values) {
  const Limit& limit = lot.sheet.limits[index];
  FigurePanel panel{.x_label = "units from the lowest value to the highest",
                    .y_label = limit.quantity,
                    .y_unit = limit.unit,
                    .height = 1.1};
  std::vector<std::size_t> order(values.y.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return values.y[a] < values.y[b]; });
  FigureSeries points{Mark::error_bars, "value, 95 % interval", {}, {}, {}};
  for (std::size_t i = 0; i < order.size(); ++i) {
    points.x.push_back(static_cast<double>(i + 1));
    points.y.push_back(values.y[order[i]]);
    points.y2.push_back(values.half[order[i]]);
  }
  add_limits(panel, limit, static_cast<double>(order.size() + 1));
  panel.series.push_back(std::move(points));
  return panel;
}

FigurePanel histogram_panel(const Limit& limit, const std::vector<double>& y) {
  FigurePanel panel{.x_label = limit.quantity, .y_label = "units", .x_unit = limit.unit, .height = 0.7};
  const auto [least, most] = std::minmax_element(y.begin(), y.end());
  const double low = *least, span = *most > low ? *most - low : std::fabs(low) * 1e-6 + 1e-300;
  // Freedman and Diaconis: a unit far from the others does not make the bins of all others wide.
  std::vector<double> sorted = y;
  std::sort(sorted.begin(), sorted.end());
  const double middle = sorted[sorted.size() * 3 / 4] - sorted[sorted.size() / 4];
  const double wanted = middle > 0 ? span * std::cbrt(static_cast<double>(y.size())) / (2 * middle) : kLeastBins;
  const auto bins = static_cast<std::size_t>(std::clamp(std::ceil(wanted), kLeastBins, kMostBins));
  const double width = span / static_cast<double>(bins);
  std::vector<double> count(bins, 0);
  for (const double value : y) {
    count[std::min(bins - 1, static_cast<std::size_t>(std::max(0.0, (value - low) / width)))] += 1;
  }
  FigureSeries steps{Mark::steps, "", {}, {}, {}};
  // A step begins and ends on the ground.
  steps.x.push_back(low);
  steps.y.push_back(0);
  for (std::size_t i = 0; i < bins; ++i) {
    steps.x.push_back(low + static_cast<double>(i) * width);
    steps.y.push_back(count[i]);
  }
  steps.x.push_back(low + span);
  steps.y.push_back(0);
  panel.series.push_back(std::move(steps));
  for (const auto& edge : {limit.min, limit.max}) {
    if (!edge) continue;
    panel.x_rules.push_back(*edge);
    panel.series.push_back({Mark::line, "", {*edge, *edge}, {0, 0}, {}});  // so that the axis reaches it
  }
  panel.rules_label = panel.x_rules.empty() ? "" : "limits";
  return panel;
}

FigurePanel run_panel(const LotRecord& lot, const Limit& limit, const Values& values) {
  FigurePanel panel{.x_label = "units in the order of the lot", .y_label = limit.quantity, .y_unit = limit.unit, .height = 0.9};
  const auto last = static_cast<double>(lot.units.size() + 1);
  if (const auto chart = individuals_chart(values.y)) {
    panel.series.push_back(level(Mark::dashes, "process limits", 0, last, chart->high));
    panel.series.push_back(level(Mark::dashes, "", 0, last, chart->low));
    panel.series.push_back(level(Mark::trace, "mean", 0, last, chart->centre));
  }
  panel.series.push_back({Mark::line, "", values.x, values.y, {}});
  panel.series.push_back({Mark::error_bars, "value", values.x, values.y, std::vector<double>(values.y.size(), std::nan(""))});
  return panel;
}

}  // namespace

Figure lot_values_figure(const LotRecord& lot, std::size_t limit) {
  Figure figure;
  const Values values = values_of(lot, limit);
  if (values.y.size() < 2) return figure;
  figure.panels = {sorted_panel(lot, limit, values), histogram_panel(lot.sheet.limits[limit], values.y),
                   run_panel(lot, lot.sheet.limits[limit], values)};
  return figure;
}

Figure operating_figure(const LotRecord& lot) {
  Figure figure;
  if (!lot.plan || lot.plan->scheme == SamplingScheme::all || lot.plan->whole_lot) return figure;
  FigurePanel panel{.x_label = "bad units in the lot, %", .y_label = "lots accepted, %", .height = 1.3};
  FigureSeries curve{Mark::line, "", {}, {}, {}};
  for (const OperatingPoint& point : operating_characteristic(*lot.plan)) {
    curve.x.push_back(100 * point.fraction_nonconforming);
    curve.y.push_back(100 * point.acceptance);
  }
  panel.series.push_back(std::move(curve));
  if (lot.plan->aql_percent > 0) {
    panel.x_rules = {lot.plan->aql_percent};
    panel.rules_label = "acceptable quality limit";
  }
  figure.panels.push_back(std::move(panel));
  return figure;
}

Figure check_figure(const LotRecord& lot) {
  Figure figure;
  if (!lot.check_chart || !lot.sheet.check_standard || lot.check_chart->readings.empty()) return figure;
  const CheckChart& chart = *lot.check_chart;
  FigurePanel panel{.x_label = "readings of the check standard, oldest first",
                    .y_label = lot.sheet.check_standard->quantity,
                    .y_unit = lot.sheet.check_standard->unit,
                    .height = 1.3};
  FigureSeries points{Mark::error_bars, "reading", {}, {}, {}};
  for (std::size_t i = 0; i < chart.readings.size(); ++i) {
    points.x.push_back(static_cast<double>(i + 1));
    points.y.push_back(chart.readings[i].value);
    points.y2.push_back(std::nan(""));
  }
  const double last = static_cast<double>(chart.readings.size() + 1);
  if (chart.established) {
    panel.series.push_back(level(Mark::dashes, "control limits", 0, last, chart.low));
    panel.series.push_back(level(Mark::dashes, "", 0, last, chart.high));
    panel.series.push_back(level(Mark::trace, "centre", 0, last, chart.centre));
  }
  panel.series.push_back(std::move(points));
  figure.panels.push_back(std::move(panel));
  return figure;
}

}  // namespace coilassay

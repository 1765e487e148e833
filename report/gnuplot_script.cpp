#include "report/gnuplot_script.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

#include "base/outside_text.h"
#include "report/text_layout.h"
#include "report/wording.h"

namespace coilassay {

namespace {

using Mark = FigureSeries::Mark;

constexpr int kWidth = 800;
constexpr int kPanelHeight = 170;  // of a panel of height 1
constexpr int kTitleHeight = 34;
constexpr int kKeyHeight = 26;    // above a panel that names its series
constexpr int kGapHeight = 12;    // above one that does not
constexpr int kTicksHeight = 54;  // below a panel with its own x axis
constexpr double kLeft = 0.105, kRight = 0.975;

/// Differs in weight, dash and grey value, so that it reads without colour.
std::string_view look_of(Mark mark) {
  switch (mark) {
    case Mark::line: return "with lines lc rgb '#14375e' lw 1.1 dt solid";
    case Mark::trace: return "with lines lc rgb '#b3bfcc' lw 2.6 dt solid";
    case Mark::dots: return "with points lc rgb '#3d5a73' pt 7 ps 0.18";
    case Mark::dashes: return "with lines lc rgb '#a8480f' lw 1.5 dt (9,6)";
    case Mark::band: return "with filledcurves fc rgb '#d9e2ea' fs solid noborder";
    case Mark::steps: return "with steps lc rgb '#14375e' lw 1.4";
    case Mark::error_bars: return "with yerrorbars lc rgb '#a8480f' lw 1.3 pt 7 ps 0.6";
  }
  return "with lines";
}

struct Prefix {
  double per_si;
  std::string_view text;
};

/// The prefix that brings the largest value into 1 .. 1000.
Prefix prefix_for(double largest) {
  constexpr std::array kPrefixes = {Prefix{1e-9, "G"}, Prefix{1e-6, "M"}, Prefix{1e-3, "k"}, Prefix{1, ""},
                                    Prefix{1e3, "m"},  Prefix{1e6, "µ"},  Prefix{1e9, "n"},  Prefix{1e12, "p"}};
  if (!(largest > 0)) return {1, ""};
  for (const Prefix& each : kPrefixes) {
    if (largest * each.per_si >= 1) return each;
  }
  return kPrefixes.back();
}

struct Range {
  double low = std::numeric_limits<double>::infinity();
  double high = -std::numeric_limits<double>::infinity();
  void add(double value) {
    if (!std::isfinite(value)) return;
    low = std::min(low, value);
    high = std::max(high, value);
  }
  bool empty() const { return !(low <= high); }
  double largest() const { return empty() ? 0 : std::fmax(std::fabs(low), std::fabs(high)); }
};

Range x_range(const FigurePanel& panel) {
  Range range;
  for (const FigureSeries& each : panel.series)
    std::for_each(each.x.begin(), each.x.end(), [&](double x) { range.add(x); });
  return range;
}

Range y_range(const FigurePanel& panel) {
  Range range;
  for (const FigureSeries& each : panel.series) {
    for (std::size_t i = 0; i < each.y.size(); ++i) {
      const double y2 = i < each.y2.size() ? each.y2[i] : std::nan("");
      range.add(each.y[i]);
      if (each.mark == Mark::error_bars) range.add(each.y[i] + y2), range.add(each.y[i] - y2);
      if (each.mark == Mark::band) range.add(y2);
    }
  }
  return range;
}

/// An axis in the unit it is labelled with: drawn values are (value - shift) * prefix.
struct Axis {
  Range range;  // as drawn, with a margin
  double shift = 0;
  Prefix prefix{1, ""};
  std::string label;
  bool log = false;

  double drawn(double value) const { return (value - shift) * prefix.per_si; }
};

/// A short stretch far from zero would have the same tick labels everywhere: it is counted from a round value.
double shift_for(const Range& range) {
  const double span = range.high - range.low;
  if (!(span > 0) || range.largest() < 2000 * span) return 0;
  const double step = std::pow(10, std::ceil(std::log10(span)));
  return std::round(range.low / step) * step;
}

Axis axis_of(Range range, const std::string& words, Unit unit, bool log, double margin) {
  Axis axis;
  axis.log = log;
  axis.label = words;
  if (range.empty()) range = log ? Range{1, 10} : Range{-1, 1};
  if (!log && unit != Unit::one) {
    axis.shift = shift_for(range);
    if (axis.shift != 0) axis.label += " from " + setting_in_words(axis.shift, unit, Script::utf8, 12);
    axis.prefix = prefix_for(Range{range.low - axis.shift, range.high - axis.shift}.largest());
  }
  if (unit != Unit::one) axis.label += fmt::format(" ({}{})", axis.prefix.text, display_symbol(unit));
  const double low = axis.drawn(range.low), high = axis.drawn(range.high);
  if (log && low > 0) {
    axis.range = {low / std::pow(high / low, margin), high * std::pow(high / low, margin)};
    return axis;
  }
  const double span = high > low ? high - low : std::fmax(std::fabs(high), 1e-12);
  axis.range = {low - margin * span, high + margin * span};
  return axis;
}

bool shares_x(const FigurePanel& a, const FigurePanel& b) {
  return a.x_unit == b.x_unit && a.x_unit != Unit::one && a.x_log == b.x_log;
}

/// Ten digits of x and seven of y are finer than any screen and a third of the bytes.
void add_row(std::string& out, double x, double y, const double* y2) {
  const auto number = [](double v, int digits) {
    return std::isfinite(v) ? fmt::format("{:.{}g}", v, digits) : std::string("NaN");
  };
  out += number(x, 10) + ' ' + number(y, 7);
  if (y2 != nullptr) out += ' ' + number(*y2, 7);
  out += '\n';
}

void add_data(std::string& out, const FigureSeries& whole, std::string_view name, const Axis& x, const Axis& y) {
  const FigureSeries series = thinned(whole);
  out += fmt::format("${} << EOD\n", name);
  for (std::size_t i = 0; i < series.x.size() && i < series.y.size(); ++i) {
    const double second = i < series.y2.size() ? series.y2[i] : std::nan("");
    const double y2 = series.mark == Mark::error_bars ? second * y.prefix.per_si : y.drawn(second);
    add_row(out, x.drawn(series.x[i]), y.drawn(series.y[i]), series.y2.empty() ? nullptr : &y2);
  }
  out += "EOD\n";
}

std::string plot_item(const FigureSeries& series, std::string_view name) {
  std::string_view columns = series.y2.empty() ? "1:2" : "1:2:3";
  std::string_view look = look_of(series.mark);
  // A point whose uncertainty is not known is drawn without a bar.
  const bool bars = series.mark == Mark::error_bars &&
                    std::any_of(series.y2.begin(), series.y2.end(), [](double u) { return std::isfinite(u); });
  if (series.mark == Mark::error_bars && !bars) {
    columns = "1:2";
    look = "with points lc rgb '#a8480f' pt 7 ps 0.6";
  }
  const std::string title = series.label.empty() ? "notitle" : "title " + gnuplot_text(series.label);
  return fmt::format("${} using {} {} {}", name, columns, look, title);
}

bool has_key(const FigurePanel& panel) {
  return !panel.rules_label.empty() ||
         std::any_of(panel.series.begin(), panel.series.end(), [](const FigureSeries& s) { return !s.label.empty(); });
}
int height_above(const FigurePanel& panel) {
  return has_key(panel) ? kKeyHeight : kGapHeight;
}

/// gnuplot gives each name of a series more room the longer it is, and too much to the long ones: a correction in
/// characters, found by looking.
int key_widening(const FigurePanel& panel) {
  std::size_t longest = display_width(panel.rules_label);
  for (const FigureSeries& each : panel.series) longest = std::max(longest, display_width(each.label));
  return longest >= 14 ? -4 : longest >= 8 ? -1 : 2;
}

struct Place {
  double top, bottom;  // of the plotting area, as fractions of the height from below
  bool own_x;          // has tick labels and an axis label
};

void add_panel(std::string& out, const FigurePanel& panel, const Axis& x, const Place& place, std::size_t index,
               double key_y) {
  const Axis y = axis_of(y_range(panel), panel.y_label, panel.y_unit, panel.y_log, 0.06);
  for (std::size_t s = 0; s < panel.series.size(); ++s)
    add_data(out, panel.series[s], fmt::format("p{}s{}", index, s), x, y);
  out += fmt::format("set tmargin at screen {:.5f}\nset bmargin at screen {:.5f}\n", place.top, place.bottom);
  out += fmt::format("set key at screen {:.4f},{:.5f} right top horizontal Left reverse samplen 2 width {}\n", kRight,
                     key_y, key_widening(panel));
  out += fmt::format("set xrange [{:.10g}:{:.10g}]\nset yrange [{:.10g}:{:.10g}]\n", x.range.low, x.range.high,
                     y.range.low, y.range.high);
  out += fmt::format("{} logscale x\n{} logscale y\n", x.log ? "set" : "unset", y.log ? "set" : "unset");
  out += fmt::format("set format x '{}'\nset format y '{}'\n",
                     !place.own_x ? ""
                     : x.log      ? "%.0s%c"
                                  : "%g",
                     y.log ? "%.0s%c" : "%g");
  out += "set xlabel " + gnuplot_text(place.own_x ? x.label : "") + '\n';
  out += "set ylabel " + gnuplot_text(y.label) + '\n';
  out += "unset arrow\n";
  for (double rule : panel.x_rules) {
    if (!std::isfinite(rule)) continue;
    out += fmt::format(
        "set arrow from first {0:.10g}, graph 0 to first {0:.10g}, graph 1 nohead front lc rgb '#2b2b2b' lw 1.2 dt "
        "(2,4)\n",
        x.drawn(rule));
  }
  out += "plot ";
  for (std::size_t s = 0; s < panel.series.size(); ++s) {
    out += (s > 0 ? ", " : "") + plot_item(panel.series[s], fmt::format("p{}s{}", index, s));
  }
  if (!panel.x_rules.empty() && !panel.rules_label.empty()) {
    out += ", keyentry with lines lc rgb '#2b2b2b' lw 1.2 dt (2,4) title " + gnuplot_text(panel.rules_label);
  }
  out += '\n';
}

}  // namespace

FigureSeries thinned(const FigureSeries& series, std::size_t limit) {
  const std::size_t count = std::min(series.x.size(), series.y.size());
  if (count <= limit || limit < 4) return series;
  FigureSeries result{series.mark, series.label, {}, {}, {}};
  const auto keep = [&](std::size_t i) {
    result.x.push_back(series.x[i]);
    result.y.push_back(series.y[i]);
    if (!series.y2.empty()) result.y2.push_back(i < series.y2.size() ? series.y2[i] : std::nan(""));
  };
  const std::size_t stretches = limit / 2;
  for (std::size_t s = 0; s < stretches; ++s) {
    const std::size_t begin = s * count / stretches, end = (s + 1) * count / stretches;
    std::optional<std::size_t> lowest, highest;
    for (std::size_t i = begin; i < end; ++i) {
      if (!std::isfinite(series.y[i])) continue;
      const double top = series.mark == Mark::band && i < series.y2.size() ? series.y2[i] : series.y[i];
      const double top_so_far = !highest ? 0 : series.mark == Mark::band ? series.y2[*highest] : series.y[*highest];
      if (!lowest || series.y[i] < series.y[*lowest]) lowest = i;
      if (!highest || top > top_so_far) highest = i;
    }
    if (!lowest) {
      keep(begin);
      continue;
    }
    keep(std::min(*lowest, *highest));
    if (*lowest != *highest) keep(std::max(*lowest, *highest));
  }
  return result;
}

std::string gnuplot_text(std::string_view outside) {
  std::string quoted = "'";
  for (char c : shown(outside, 120)) {
    if (static_cast<unsigned char>(c) < 0x20 || c == 0x7f)
      continue;  // shown() has escaped them; never rely on one guard here
    quoted += c;
    if (c == '\'') quoted += '\'';
  }
  return quoted + "'";
}

DrawingSize drawing_size(const Figure& figure) {
  double height = kTitleHeight;
  for (std::size_t i = 0; i < figure.panels.size(); ++i) {
    const bool own_x = i + 1 == figure.panels.size() || !shares_x(figure.panels[i], figure.panels[i + 1]);
    height += height_above(figure.panels[i]) + kPanelHeight * figure.panels[i].height + (own_x ? kTicksHeight : 0);
  }
  return {kWidth, static_cast<int>(std::lround(height))};
}

std::string gnuplot_script(const Figure& figure, std::string_view prefix) {
  const DrawingSize size = drawing_size(figure);
  std::string out = fmt::format(
      "set encoding utf8\n"
      "set terminal svg noenhanced size {},{} fixed font 'sans-serif,13' background '#ffffff' linewidth 1 name '{}'\n"
      "set multiplot\n"
      "set lmargin at screen {}\nset rmargin at screen {}\n"
      "set border 3 lc rgb '#4d4d4d' lw 0.8\n"
      "set tics out nomirror scale 0.5 textcolor rgb '#262626'\n"
      "set xtics offset 0,0.4\nset xlabel offset 0,0.9\n"
      "set grid lt 1 lw 0.6 lc rgb '#d8dde3' dt solid\n"
      "set bars small\n",
      size.width, size.height, prefix, kLeft, kRight);
  out += fmt::format("set label 1 {} at screen 0.02,{:.5f} left noenhanced textcolor rgb '#111111' font ',15'\n",
                     gnuplot_text(figure.title), 1 - 20.0 / size.height);
  double y = size.height - kTitleHeight;  // from below, in pixels
  std::size_t group = 0;                  // first panel of those that share x
  for (std::size_t i = 0; i < figure.panels.size(); ++i) {
    if (i > 0 && !shares_x(figure.panels[i - 1], figure.panels[i])) group = i;
    std::size_t group_end = group + 1;
    Range shared = x_range(figure.panels[group]);
    for (; group_end < figure.panels.size() && shares_x(figure.panels[group], figure.panels[group_end]); ++group_end) {
      const Range more = x_range(figure.panels[group_end]);
      shared.add(more.low);
      shared.add(more.high);
    }
    const FigurePanel& panel = figure.panels[i];
    const bool has_marks = std::any_of(panel.series.begin(), panel.series.end(),
                                       [](const FigureSeries& s) { return s.mark == Mark::error_bars; });
    const Axis x = axis_of(shared, panel.x_label, panel.x_unit, panel.x_log, has_marks ? 0.04 : 0.0);
    const bool own_x = i + 1 == group_end;
    const double top = y - height_above(panel), bottom = top - kPanelHeight * panel.height;
    add_panel(out, panel, x, {top / size.height, bottom / size.height, own_x}, i, (y - 1) / size.height);
    if (i == 0) out += "unset label 1\n";
    y = bottom - (own_x ? kTicksHeight : 0);
  }
  return out + "unset multiplot\n";
}

}  // namespace coilassay

// One figure description of ours, drawn by gnuplot as a child process.
#pragma once

#include <string>
#include <vector>

#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

struct FigureSeries {
  enum class Mark {
    line,    // thin and dark: what was computed
    trace,   // broad and pale: what was captured, to be seen below a line
    dots,    // small and separate
    dashes,  // an edge
    band,    // from y to y2
    steps,
    error_bars,  // points with bars of half-height y2
  } mark = Mark::line;
  std::string label;             // outside text is made safe when drawn
  std::vector<double> x, y, y2;  // y2: upper edge of a band, half-height of error bars; else empty
};
struct FigurePanel {
  std::string x_label = {}, y_label = {};  // "time", "voltage": the drawing adds the unit with its prefix, "time (µs)"
  Unit x_unit = Unit::one,
       y_unit = Unit::one;  // values are given in SI and scaled by the drawing; Unit::one is not scaled
  bool x_log = false, y_log = false;
  std::vector<FigureSeries> series = {};
  std::vector<double> x_rules = {};  // vertical lines
  std::string rules_label = {};      // what they mean
  double height = 1;                 // relative to the other panels
};
struct Figure {
  std::string title;
  std::vector<FigurePanel> panels;  // stacked, sharing x when the units agree
};

/// What a measurement looks like; the panels depend on its test and its tables. No panels when it has nothing to draw.
Figure figure_of(const Measurement& measurement);

/// The figure as SVG text, ids made unique by `prefix` (letters and digits). missing_helper when gnuplot is not there
/// ("apt install gnuplot-nox") or fails; usage when the figure has no panels.
Result<std::string> draw_svg(const Figure& figure, const std::string& prefix = "f");

}  // namespace coilassay

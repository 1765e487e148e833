// One figure description of ours, drawn by gnuplot as a child process.
#pragma once

#include <string>
#include <vector>

#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

struct FigureSeries {
  enum class Mark { line, dots, dashes, band, steps } mark = Mark::line;
  std::string label;               // outside text is made safe when drawn
  std::vector<double> x, y, y2;    // y2: upper edge of a band
};
struct FigurePanel {
  std::string x_label, y_label;    // with units: "time (µs)"; values are given in SI and scaled by prefix
  Unit x_unit = Unit::one, y_unit = Unit::one;
  bool x_log = false, y_log = false;
  std::vector<FigureSeries> series;
  std::vector<double> x_rules;     // vertical lines
};
struct Figure {
  std::string title;
  std::vector<FigurePanel> panels;   // stacked, sharing x when the units agree
};

/// What a measurement looks like; the panels depend on its test and its tables.
Figure figure_of(const Measurement& measurement);

/// The figure as SVG text, ids made unique by `prefix`. missing_helper when gnuplot is not there ("apt install
/// gnuplot-nox") or fails.
Result<std::string> draw_svg(const Figure& figure, const std::string& prefix = "f");

}  // namespace coilassay

// A figure as a script for gnuplot.
#pragma once

#include <string>
#include <string_view>

#include "report/figure.h"

namespace coilassay {

/// At most about `limit` points that look the same when drawn: of each stretch the lowest and the highest stay, in
/// their order. Places without a number stay as gaps.
FigureSeries thinned(const FigureSeries& series, std::size_t limit = 2000);

/// Outside text as a string constant of gnuplot: single quotes (double quotes would run what stands in backquotes), on
/// one line (a line that begins with "!" would run a command), control characters shown as escapes.
std::string gnuplot_text(std::string_view outside);

/// The whole script: data inline, no file read or written, svg to standard output, ids beginning with `prefix`.
std::string gnuplot_script(const Figure& figure, std::string_view prefix);

/// Size of the drawing in pixels.
struct DrawingSize {
  int width, height;
};
DrawingSize drawing_size(const Figure& figure);

}  // namespace coilassay

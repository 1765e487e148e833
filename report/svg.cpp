// Drawing a figure: gnuplot as a child, and its svg made fit to stand in a page beside others.
#include "report/child_process.h"
#include "report/figure.h"
#include "report/gnuplot_script.h"
#include "report/html_builder.h"

namespace coilassay {

namespace {

/// What the panels show, for those who cannot see them.
std::string description(const Figure& figure) {
  std::string text;
  for (const FigurePanel& panel : figure.panels) {
    text += (text.empty() ? "" : "; ") + panel.y_label + " against " + panel.x_label;
    std::string names;
    for (const FigureSeries& each : panel.series) {
      if (!each.label.empty()) names += (names.empty() ? "" : ", ") + each.label;
    }
    if (!names.empty()) text += " (" + names + ")";
  }
  return text;
}

void replace_all(std::string& text, std::string_view from, std::string_view to) {
  for (std::size_t at = 0; (at = text.find(from, at)) != std::string::npos; at += to.size())
    text.replace(at, from.size(), to);
}

/// Replaces what stands between two marks, once.
void replace_between(std::string& text, std::string_view begin, std::string_view end, std::string_view with) {
  const std::size_t from = text.find(begin);
  const std::size_t to = from == std::string::npos ? from : text.find(end, from);
  if (to != std::string::npos) text.replace(from, to + end.size() - from, with);
}

/// gnuplot names its own parts alike in every drawing ("gpDot", "gnuplot_canvas"), and titles each curve with its
/// number, which browsers show as a hint.
std::string made_unique(std::string svg, const Figure& figure, const std::string& prefix) {
  const std::string curve_title = "<title>" + prefix + "_plot_";
  for (std::size_t at = 0; (at = svg.find(curve_title, at)) != std::string::npos;) {
    const std::size_t end = svg.find("</title>", at);
    if (end == std::string::npos) break;
    svg.erase(at, end + std::string_view("</title>").size() - at);
  }
  // Only gnuplot's own names are touched, never outside text, which is escaped and holds no quote followed by them.
  for (const std::string_view name : {"gpDot", "gpPt", "gnuplot_canvas", "textbox", "greybox", "gpPat"}) {
    for (const std::string_view before : {"id='", "id=\"", "href='#", "href=\"#", "url(#"}) {
      replace_all(svg, std::string(before) + std::string(name), std::string(before) + prefix + '_' + std::string(name));
    }
  }
  const std::string labelled = " role=\"img\" aria-labelledby=\"" + prefix + "_title " + prefix + "_desc\"\n width=";
  const std::size_t tag = svg.find("<svg");
  const std::size_t width = svg.find(" width=", tag);
  if (width != std::string::npos) svg.replace(width, std::string_view(" width=").size(), labelled);
  replace_between(svg, "<title>", "</title>",
                  "<title id=\"" + prefix + "_title\">" + html_escaped(figure.title) + "</title>");
  replace_between(svg, "<desc>", "</desc>",
                  "<desc id=\"" + prefix + "_desc\">" + html_escaped(description(figure)) + "</desc>");
  return svg;
}

}  // namespace

Result<std::string> draw_svg(const Figure& figure, const std::string& prefix) {
  if (figure.panels.empty()) {
    return failure(Problem::usage, "--figure", "this measurement has nothing to draw", "leave the figure out");
  }
  const auto gnuplot = find_program("gnuplot");
  if (!gnuplot) {
    return failure(Problem::missing_helper, "gnuplot", "figures are drawn by gnuplot, which is not installed",
                   "apt install gnuplot-nox, or leave the figure out");
  }
  auto scratch = ScratchFolder::make();
  if (!scratch) return failure(scratch);
  auto outcome = run_child({.program = *gnuplot,
                            .arguments = {"--default-settings", "-"},
                            .input = gnuplot_script(figure, prefix),
                            .folder = scratch->path(),
                            .time_limit = std::chrono::seconds(20)});
  if (!outcome) return failure(outcome);
  std::string& svg = outcome->output;
  if (outcome->exit_code != 0 || svg.find("<svg") == std::string::npos || svg.find("</svg>") == std::string::npos) {
    return failure(Problem::missing_helper, "gnuplot", "gnuplot did not draw the figure",
                   "check the installation with: gnuplot --version (5.4 or newer is needed)");
  }
  return made_unique(std::move(svg), figure, prefix);
}

}  // namespace coilassay

#include "report/figure.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <map>
#include <set>

#include "report/gnuplot_script.h"
#include "tests/report/made_up.h"
#include "tests/report/path_setting.h"

namespace coilassay {
namespace {

/// Without printing the whole page when it fails.
bool has(const std::string& text, std::string_view part) {
  return text.find(part) != std::string::npos;
}

constexpr std::string_view kHostile =
    "<script>alert(1)</script>`touch hit1`\"';\n!touch hit2\nsystem('touch hit3')\x1b\xe2\x80\xae\xff&";

Figure hostile_figure() {
  Figure figure;
  figure.title = kHostile;
  FigurePanel panel;
  panel.x_label = panel.y_label = panel.rules_label = kHostile;
  panel.x_unit = Unit::second;
  panel.x_rules = {0.5};
  panel.series = {{FigureSeries::Mark::line, std::string(kHostile), {0, 1}, {0, 1}, {}}};
  figure.panels = {panel};
  return figure;
}

std::vector<std::string> ids(const std::string& svg) {
  std::vector<std::string> list;
  for (const char quote : {'\'', '"'}) {
    const std::string mark = std::string(" id=") + quote;
    for (std::size_t at = 0; (at = svg.find(mark, at)) != std::string::npos;) {
      at += mark.size();
      list.push_back(svg.substr(at, svg.find(quote, at) - at));
    }
  }
  return list;
}

TEST(Figure, RingDownShowsCaptureFitEnvelopeResidualsAndWindow) {
  const Figure figure = figure_of(test::made_up_ring_down());
  ASSERT_EQ(figure.panels.size(), 2u);
  EXPECT_EQ(figure.panels[0].series.size(), 4u);
  EXPECT_EQ(figure.panels[0].x_rules, (std::vector<double>{4e-7, 3.8e-4}));
  EXPECT_EQ(figure.panels[1].series.size(), 1u);
  EXPECT_EQ(figure_of(test::made_up_line()).panels.size(), 3u);
  EXPECT_TRUE(figure_of(test::made_up_refusal()).panels.empty());
}

TEST(Figure, SvgNamesAxesWithReadableUnits) {
  const auto svg = draw_svg(figure_of(test::made_up_line()));
  ASSERT_TRUE(svg) << svg.error().finding;
  for (const char* part :
       {"time (µs)", "voltage (V)", "capture - fit (mV)", "capacitance added (nF)", "1/(2πf₀)² (µs²)", "envelope",
        "window of the fit", "<title id=\"f_title\">Ring-down: 2 files</title>"}) {
    EXPECT_TRUE(has(*svg, part)) << part;
  }
  EXPECT_FALSE(has(*svg, "GNUPLOT")) << "GNUPLOT";
  EXPECT_FALSE(has(*svg, "_plot_1</title>")) << "_plot_1</title>";
  EXPECT_LT(svg->size(), 400'000u);
}

TEST(Figure, SameFigureGivesTheSameBytes) {
  const auto once = draw_svg(figure_of(test::made_up_ring_down())),
             again = draw_svg(figure_of(test::made_up_ring_down()));
  ASSERT_TRUE(once && again);
  EXPECT_TRUE(*once == *again);
}

TEST(Figure, IdsAreUniqueWithinAndAcrossFigures) {
  const auto first = draw_svg(figure_of(test::made_up_line()), "a"),
             second = draw_svg(figure_of(test::made_up_line()), "b");
  ASSERT_TRUE(first && second);
  std::vector<std::string> all = ids(*first);
  const std::size_t count = all.size();
  EXPECT_GT(count, 10u);
  for (const std::string& id : ids(*second)) all.push_back(id);
  EXPECT_EQ(std::set<std::string>(all.begin(), all.end()).size(), 2 * count);
  // Every reference finds its mark.
  for (std::size_t at = 0; (at = first->find("href='#", at)) != std::string::npos;) {
    at += 7;
    EXPECT_NE(std::find(all.begin(), all.end(), first->substr(at, first->find('\'', at) - at)), all.end());
  }
}

TEST(Figure, OutsideTextRunsNothingAndStaysText) {
  const auto svg = draw_svg(hostile_figure());
  ASSERT_TRUE(svg) << svg.error().finding;
  EXPECT_FALSE(has(*svg, "<script")) << "<script";
  EXPECT_TRUE(has(*svg, "&lt;script&gt;")) << "&lt;script&gt;";
  EXPECT_FALSE(has(*svg, "\x1b")) << "\x1b";
  EXPECT_FALSE(has(*svg, "\xe2\x80\xae")) << "\xe2\x80\xae";
  EXPECT_FALSE(has(*svg, "\xff")) << "\xff";
  EXPECT_TRUE(has(*svg, "`touch hit1`")) << "`touch hit1`";
  const std::string script = gnuplot_script(hostile_figure(), "f");
  EXPECT_FALSE(has(script, "\n!")) << "\n!";
  EXPECT_FALSE(has(script, "\nsystem")) << "\nsystem";
  for (const char* file : {"hit1", "hit2", "hit3"}) EXPECT_FALSE(std::filesystem::exists(file));
}

TEST(Figure, QuotesAreDoubledAndLinesJoined) {
  EXPECT_EQ(gnuplot_text("it's `x` \"y\""), "'it''s `x` \"y\"'");
  EXPECT_EQ(gnuplot_text("a\n!b"), "'a\\x0a!b'");
}

TEST(Figure, WithoutGnuplotTheRemedyNamesThePackage) {
  const test::PathSetting nowhere("");
  const auto svg = draw_svg(figure_of(test::made_up_ring_down()));
  ASSERT_FALSE(svg);
  EXPECT_EQ(svg.error().problem, Problem::missing_helper);
  EXPECT_TRUE(has(svg.error().remedy, "apt install gnuplot-nox")) << "apt install gnuplot-nox";
}

TEST(Figure, NothingToDrawIsSaid) {
  const auto svg = draw_svg(Figure{});
  ASSERT_FALSE(svg);
  EXPECT_EQ(svg.error().problem, Problem::usage);
}

// Panels of one value, of none, and on logarithmic axes are drawn as well.
TEST(Figure, DrawsOddData) {
  Figure figure;
  FigurePanel flat{.x_label = "time", .y_label = "voltage", .x_unit = Unit::second, .y_unit = Unit::volt};
  flat.series = {{FigureSeries::Mark::dots, "one", {1e-6}, {0.0}, {}}, {FigureSeries::Mark::band, "none", {}, {}, {}}};
  FigurePanel missing = flat;
  missing.series = {{FigureSeries::Mark::line, "gap", {0, 1, 2}, {1, std::nan(""), 3}, {}}};
  FigurePanel logarithmic{.x_label = "frequency",
                          .y_label = "impedance",
                          .x_unit = Unit::hertz,
                          .y_unit = Unit::ohm,
                          .x_log = true,
                          .y_log = true};
  logarithmic.series = {{FigureSeries::Mark::steps, "z", {1e2, 1e4, 1e7}, {0.1, 10, 1e5}, {}},
                        {FigureSeries::Mark::band, "range", {1e2, 1e4, 1e7}, {0.05, 5, 5e4}, {0.2, 20, 2e5}}};
  figure.panels = {flat, missing, logarithmic};
  const auto svg = draw_svg(figure);
  ASSERT_TRUE(svg) << svg.error().finding;
  EXPECT_TRUE(has(*svg, "frequency (Hz)")) << "frequency (Hz)";
}

// Otherwise every tick would be labelled 3.6e+06.
TEST(Figure, AShortStretchFarFromZeroIsCountedFromARoundTime) {
  Figure figure;
  FigurePanel panel{.x_label = "time", .y_label = "voltage", .x_unit = Unit::second, .y_unit = Unit::volt};
  panel.series = {{FigureSeries::Mark::line, "", {3600.0001, 3600.0003, 3600.0005}, {-1, 0, 1}, {}}};
  panel.x_rules = {3600.0002};
  figure.panels = {panel};
  const std::string script = gnuplot_script(figure, "f");
  EXPECT_TRUE(has(script, "time from 3.6 ks (µs)")) << script;
  EXPECT_TRUE(has(script, "from first 200,") || has(script, "from first 199.99")) << script;
  const auto svg = draw_svg(figure);
  ASSERT_TRUE(svg);
  EXPECT_TRUE(has(*svg, "<text>250</text>") || has(*svg, "<text>200</text>"));
}

TEST(Thinning, KeepsTheExtremesOfEveryStretch) {
  FigureSeries series;
  for (int i = 0; i < 1'000'000; ++i) {
    series.x.push_back(i);
    series.y.push_back(std::sin(i * 0.37));
  }
  series.y[123'456] = 7;  // one sample wide
  series.y[654'321] = -9;
  const FigureSeries few = thinned(series, 2000);
  EXPECT_LE(few.x.size(), 2000u);
  EXPECT_GE(few.x.size(), 1900u);
  EXPECT_EQ(*std::max_element(few.y.begin(), few.y.end()), 7);
  EXPECT_EQ(*std::min_element(few.y.begin(), few.y.end()), -9);
  EXPECT_TRUE(std::is_sorted(few.x.begin(), few.x.end()));
}

TEST(Thinning, LeavesShortSeriesAloneAndGapsOpen) {
  FigureSeries series;
  for (int i = 0; i < 10'000; ++i) {
    series.x.push_back(i);
    series.y.push_back(i < 5000 ? 1.0 : std::nan(""));
  }
  const FigureSeries few = thinned(series, 100);
  EXPECT_TRUE(std::isnan(few.y.back()));
  EXPECT_EQ(thinned(series, 20'000).x.size(), 10'000u);
}

}  // namespace
}  // namespace coilassay

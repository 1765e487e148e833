#include "report/html_report.h"

#include <fmt/format.h>

#include <cmath>

#include "base/outside_text.h"
#include "report/coupling_tables.h"
#include "report/figure.h"
#include "report/html_builder.h"
#include "report/page_style.h"
#include "report/wording.h"

namespace coilassay {

namespace {

constexpr Script kScript = Script::utf8;

void write_values(HtmlBuilder& page, const Measurement& m) {
  const auto values = values_of(m, kScript);
  if (values.empty()) return;
  page.open("section").element("h2", was_measured(m) ? "Values" : "What could be established");
  page.open("table", {{"class", "values"}}).open("thead").open("tr");
  for (const char* head : {"Quantity", "Symbol", "Value", "95 % interval", "Holds"})
    page.element("th", head, {{"scope", "col"}});
  page.close().close().open("tbody");
  for (const ValueText& each : values) {
    page.open("tr").element("th", each.words, {{"scope", "row"}});
    page.open("td").symbol(each.symbol).close();
    page.element("td", each.value, {{"class", "number"}})
        .element("td", each.deviation)
        .element("td", each.where)
        .close();
  }
  page.close().close();
  page.element(
      "p",
      "The interval holds the value with a confidence of 95 %. Where it has two different halves, both ends are given.",
      {{"class", "small"}});
  page.close();
}

void write_points(HtmlBuilder& page, const Measurement& m) {
  auto table = points_of(m, kScript);
  if (table.empty()) return;
  const std::vector<std::string> head = table.front();
  table.erase(table.begin());
  page.open("section").element("h2", "Point by point").table(head, table, "points");
  page.element("p", "The digits in brackets are the standard uncertainty of the last digits.", {{"class", "small"}})
      .close();
}

void write_remarks(HtmlBuilder& page, const Measurement& m) {
  page.open("section").element("h2", "What to watch out for");
  if (m.findings.empty() && m.cautions.empty())
    page.element("p", "Nothing was found that a reader would have to know.");
  if (!m.findings.empty() || !m.cautions.empty()) page.open("ul", {{"class", "remarks"}});
  const auto item = [&page](Severity severity, std::string_view message, std::string_view after) {
    page.open("li", {{"class", name(severity)}}).element("strong", name(severity)).text(" ").text(message);
    if (!after.empty()) page.text(" ").element("span", after, {{"class", "small"}});
    page.close();
  };
  for (const Finding& each : by_weight(m.findings)) item(each.severity, each.message, "[" + each.code + "]");
  for (const Caution& each : m.cautions) {
    const std::string figure = figure_in_words(each, kScript);
    item(each.severity, each.message, figure.empty() ? "" : "(" + figure + ")");
  }
  if (!m.findings.empty() || !m.cautions.empty()) page.close();
  if (!m.advice.empty()) {
    page.element("h3", "What to do next").open("ul");
    for (const std::string& each : m.advice) page.element("li", each);
    page.close();
  }
  page.close();
}

void write_tables(HtmlBuilder& page, const Measurement& m) {
  for (const TitledTable& each : coupling_tables(m, kScript)) {
    const std::vector<std::vector<std::string>> rows(each.rows.begin() + 1, each.rows.end());
    page.open("section").element("h2", each.title).table(each.rows.front(), rows, "points").close();
  }
}

void write_figure(HtmlBuilder& page, const Measurement& m) {
  const Figure figure = figure_of(m);
  if (figure.panels.empty()) return;
  page.open("section").element("h2", "What was seen");
  if (const auto svg = draw_svg(figure)) {
    page.open("figure", {{"class", figure.panels.size() > 2 ? "tall" : "short"}})
        .own_markup(std::string_view(*svg).substr(svg->find("<svg")))
        .close();
  } else {
    page.element("p", "There is no figure here: " + svg.error().finding + ". To have one: " + svg.error().remedy +
                          ". The numbers do not depend on it.");
  }
  page.close();
}

void write_budget(HtmlBuilder& page, const Measurement& m) {
  const auto symbols = main_symbols(m);
  if (symbols.empty()) return;
  page.open("section").element("h2", "What the uncertainty is made of");
  for (const std::string& of : symbols) {
    const Estimate* estimate = m.find(of);
    const Unit unit = estimate != nullptr ? estimate->quantity.unit : Unit::one;
    page.open("h3").symbol(of).text(": " + made_of(m.budget.at(of))).close();
    std::vector<std::vector<std::string>> rows;
    for (const BudgetLine& line : by_share(m.budget.at(of))) {
      rows.push_back({line.source, std::string(1, line.kind), to_text(line.u, unit, kScript, 2),
                      share_in_words(line.share), line.common ? "bench" : "unit", line.basis});
    }
    page.table({"Source", "Type", "u", "Share", "Error of", "Basis"}, rows, "budget");
  }
  if (!m.correlations.empty()) {
    page.open("p").text("Correlations: ");
    bool first = true;
    for (const auto& each : m.correlations) {
      page.text(first ? "" : ", ")
          .symbol(each.a)
          .text(" and ")
          .symbol(each.b)
          .text(fmt::format(" {:+.2f}", each.value));
      first = false;
    }
    page.close();
  }
  page.element("p",
               "u is what a source contributes to the standard uncertainty, its share is of the variance. Type A comes "
               "from the scatter of these data, "
               "type B from a stated tolerance or a named default. An error of the bench is the same for every unit "
               "measured on it.",
               {{"class", "small"}});
  page.close();
}

void write_method(HtmlBuilder& page, const Measurement& m) {
  page.open("section").element("h2", "How it was measured");
  const auto conditions = conditions_in_words(m.conditions, kScript);
  page.open("dl");
  const auto entry = [&page](std::string_view term, std::string_view text) {
    page.element("dt", term).element("dd", text);
  };
  entry("Conditions", conditions.empty() ? "none stated" : fmt::format("{}", fmt::join(conditions, ", ")));
  if (m.model) {
    std::string text = m.model->name + (m.model->converged ? "" : " (did not converge)");
    if (m.model->window_s) {
      text += fmt::format("; window {} to {}", to_text(m.model->window_s->first, Unit::second, kScript),
                          to_text(m.model->window_s->second, Unit::second, kScript));
    }
    if (std::isfinite(m.model->reduced_chi_square))
      text += fmt::format("; reduced chi-square {:.3g}", m.model->reduced_chi_square);
    if (m.model->runner_up) text += "; next best " + *m.model->runner_up;
    entry("Model", text);
    if (!m.model->left_out.empty()) entry("Left out", fmt::format("{}", fmt::join(m.model->left_out, ", ")));
  }
  std::string corrections;
  for (const Correction& each : m.corrections) {
    corrections += (corrections.empty() ? "" : ", ") + each.name + ' ' + to_text(each.value, each.unit, kScript);
  }
  entry("Corrections", corrections.empty() ? "none" : corrections);
  page.close();
  if (!m.equipment.empty()) {
    std::vector<std::vector<std::string>> rows;
    for (const EquipmentItem& each : m.equipment)
      rows.push_back({each.id, each.certificate, each.calibrated, each.due});
    page.element("h3", "Equipment").table({"Item", "Certificate", "Calibrated", "Due"}, rows, "equipment");
  }
  page.element("h3", "Sources");
  bool with_identity = false;
  for (const SourceRecord& each : m.sources) with_identity = with_identity || !each.source.identity.empty();
  std::vector<std::vector<std::string>> rows;
  for (const SourceRecord& each : m.sources) {
    const bool even = std::isfinite(each.sample_interval_s);
    rows.push_back({each.source.name, each.source.sha256, std::to_string(each.samples),
                    even ? setting_in_words(each.sample_interval_s, Unit::second, kScript) : "not even or not known"});
    if (with_identity) rows.back().push_back(each.source.identity);
  }
  std::vector<std::string> head = {"File", "SHA-256", "Samples", "Step"};
  if (with_identity) head.emplace_back("Instrument");
  page.table(head, rows, "sources");
  page.close();
}

}  // namespace

std::string html_report(const Measurement& m, const ReportContext& context) {
  std::string title = test_in_words(m.test) + " measurement";
  if (m.sources.size() == 1) title += ": " + shown(m.sources.front().source.name, 120);
  if (m.sources.size() > 1) title += fmt::format(" of {} files", m.sources.size());

  HtmlBuilder page;
  page.own_markup("<!DOCTYPE html>\n").open("html", {{"lang", "en"}}).open("head");
  page.empty("meta", {{"charset", "utf-8"}});
  page.empty("meta", {{"http-equiv", "Content-Security-Policy"},
                      {"content", "default-src 'none'; style-src 'unsafe-inline'; img-src data:"}});
  page.empty("meta", {{"name", "viewport"}, {"content", "width=device-width, initial-scale=1"}});
  page.element("title", title).open("style").own_markup(kPageStyle).close().close();

  page.open("body").open("header").element("h1", title);
  page.open("p").text(to_text(context.when)).text(", ").text(context.program);
  if (!context.operator_name.empty()) page.text(", measured by ").text(context.operator_name);
  page.close().close().open("main");
  if (!was_measured(m)) {
    page.open("p", {{"class", "verdict"}})
        .element("strong", "Not measured: the " + named(leading_symbol(m.test)) + ".")
        .text(" The reasons stand below.")
        .close();
    write_remarks(page, m);
    write_values(page, m);
    write_points(page, m);
    write_tables(page, m);
    write_figure(page, m);
  } else {
    write_values(page, m);
    write_points(page, m);
    write_tables(page, m);
    write_remarks(page, m);
    write_figure(page, m);
  }
  write_budget(page, m);
  write_method(page, m);
  page.close();
  page.open("footer").element("p", "This report relates only to the items measured.").close().close().close();
  return page.finish();
}

}  // namespace coilassay

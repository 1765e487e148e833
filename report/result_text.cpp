#include "report/result_text.h"

#include <fmt/format.h>

#include <cmath>

#include "base/outside_text.h"
#include "report/coupling_tables.h"
#include "report/text_layout.h"
#include "report/text_page.h"
#include "report/wording.h"

namespace coilassay {

namespace {

void write_head(TextPage& page, const Measurement& m) {
  const Script script = page.style().script;
  if (m.sources.empty()) {
    page.heading(test_in_words(m.test) + " of stated values");
  } else if (m.sources.size() == 1) {
    page.heading(test_in_words(m.test) + " of " + source_in_words(m.sources.front(), script));
  } else {
    page.heading(fmt::format("{} of {} files", test_in_words(m.test), m.sources.size()));
    for (const SourceRecord& each : m.sources) page.paragraph(source_in_words(each, script));
  }
}

void write_refusal(TextPage& page, const Measurement& m) {
  page.heading("Not measured: the " + named(leading_symbol(m.test)));
  for (const Finding& each : by_weight(m.findings)) {
    if (each.severity == Severity::refusal) page.remark(each.severity, shown(each.message, 1000));
  }
}

void write_values(TextPage& page, const Measurement& m) {
  const auto values = values_of(m, page.style().script);
  const auto conditions = conditions_in_words(m.conditions, page.style().script);
  if (!values.empty()) {
    page.heading(was_measured(m) ? "Values" : "What could be established");
    std::vector<std::vector<std::string>> rows;
    for (const ValueText& each : values) {
      rows.push_back(
          {each.words, each.symbol, each.value, each.deviation + " (95 %)", page.style().verbose ? each.where : ""});
    }
    page.table(rows);
  }
  if (!conditions.empty()) page.paragraph(fmt::format("{}", fmt::join(conditions, ", ")), "  Conditions: ");
  // What was left out of a circuit says as much as what is in it.
  if (m.test != "sweep" || !m.model || !was_measured(m)) return;
  page.paragraph(m.model->name, "  Circuit: ");
  constexpr std::size_t kNamed = 3;   // --verbose has all
  std::string left;
  for (std::size_t i = 0; i < m.model->left_out.size() && i < kNamed; ++i) left += (i == 0 ? "" : "; ") + shown(m.model->left_out[i]);
  if (m.model->left_out.size() > kNamed) left += fmt::format("; {} more", m.model->left_out.size() - kNamed);
  if (!left.empty()) page.paragraph(left, "  Left out: ");
}

void write_points(TextPage& page, const Measurement& m) {
  constexpr std::size_t kRows = 12;
  auto table = points_of(m, page.style().script);
  if (table.empty()) return;
  page.heading("Point by point (standard uncertainty of the last digits in brackets)");
  const std::size_t left = table.size() > kRows + 1 && !page.style().verbose ? table.size() - kRows - 1 : 0;
  table.resize(table.size() - left);
  page.table(table);
  if (left > 0) page.paragraph(fmt::format("and {} more with --verbose", left));
}

void write_tables(TextPage& page, const Measurement& m) {
  for (const TitledTable& each : coupling_tables(m, page.style().script)) {
    page.heading(each.title);
    page.table(each.rows);
  }
}

void write_composition(TextPage& page, const Measurement& m) {
  const auto symbols = main_symbols(m);
  if (symbols.empty()) return;
  page.heading("What the uncertainty is made of");
  std::size_t widest = 0;
  for (const std::string& each : symbols) widest = std::max(widest, each.size());
  for (const std::string& each : symbols) {
    page.paragraph(made_of(m.budget.at(each)), std::string(kTextIndent) + padded(each, widest + 2));
  }
  const auto defaults = defaults_taken(m, symbols);
  if (!defaults.empty()) page.paragraph(fmt::format("{}", fmt::join(defaults, "; ")), "  Not stated, so taken: ");
}

void write_warnings(TextPage& page, const Measurement& m) {
  constexpr std::size_t kNotes = 3;  // a reader in a hurry; --verbose has all
  const bool refused = !was_measured(m);
  std::vector<Finding> said;
  std::vector<std::string> left;
  std::size_t notes = 0;
  for (const Finding& each : by_weight(m.findings)) {
    if (refused && each.severity == Severity::refusal) continue;  // said at the top
    const bool further = each.severity == Severity::note && ++notes > kNotes && !page.style().verbose;
    if (further) {
      left.push_back(each.code);
    } else {
      said.push_back(each);
    }
  }
  if (said.empty() && left.empty() && m.cautions.empty()) return;
  page.heading("What to watch out for");
  for (const Finding& each : said) page.remark(each.severity, shown(each.message, 1000));
  if (!left.empty())
    page.remark(Severity::note, fmt::format("further notes with --verbose: {}", fmt::join(left, ", ")));
  for (const Caution& each : m.cautions) {
    const std::string figure = figure_in_words(each, page.style().script);
    page.remark(each.severity, shown(each.message, 1000) + (figure.empty() ? "" : " (" + figure + ")"));
  }
}

void write_advice(TextPage& page, const Measurement& m) {
  if (m.advice.empty()) return;
  page.heading("What to do next");
  for (const std::string& each : m.advice) page.paragraph(shown(each, 1000), "  - ");
}

// ---- only with --verbose

void write_budget(TextPage& page, const Measurement& m) {
  const Script script = page.style().script;
  for (const auto& [of, lines] : m.budget) {
    const Estimate* estimate = m.find(of);
    const Unit unit = estimate != nullptr ? estimate->quantity.unit : Unit::one;
    page.heading("Budget of " + named(of));
    std::vector<std::vector<std::string>> rows = {{"source", "type", "u", "share", "error", "basis"}};
    for (const BudgetLine& line : by_share(lines)) {
      rows.push_back({page.words(shown(line.source)), std::string(1, line.kind), to_text(line.u, unit, script, 2),
                      share_in_words(line.share), line.common ? "of the bench" : "of this unit",
                      page.words(shown(line.basis))});
    }
    page.table(rows);
  }
}

void write_origin(TextPage& page, const Measurement& m) {
  const Script script = page.style().script;
  if (!m.correlations.empty()) {
    page.heading("Correlations");
    std::vector<std::vector<std::string>> rows;
    for (const auto& each : m.correlations) rows.push_back({each.a, each.b, fmt::format("{:+.3f}", each.value)});
    page.table(rows);
  }
  if (!m.corrections.empty()) {
    page.heading("Corrections");
    std::vector<std::vector<std::string>> rows;
    for (const Correction& each : m.corrections)
      rows.push_back({page.words(shown(each.name)), to_text(each.value, each.unit, script)});
    page.table(rows);
  }
  if (m.model) {
    page.heading("Model");
    std::string text = m.model->name + (m.model->converged ? ", converged" : ", not converged");
    if (m.model->window_s) {
      text += fmt::format(", window {} to {}", to_text(m.model->window_s->first, Unit::second, script),
                          to_text(m.model->window_s->second, Unit::second, script));
    }
    if (std::isfinite(m.model->reduced_chi_square))
      text += fmt::format(", reduced chi-square {:.3g}", m.model->reduced_chi_square);
    if (m.model->runner_up) text += ", next best: " + *m.model->runner_up;
    page.paragraph(text);
    for (const std::string& each : m.model->left_out) page.paragraph("left out: " + shown(each));
  }
  if (!m.sources.empty()) {
    page.heading("Sources (SHA-256)");
    for (const SourceRecord& each : m.sources) {
      page.paragraph(each.source.sha256);
      page.paragraph(
          shown(each.source.name) + (each.source.identity.empty() ? "" : " from " + shown(each.source.identity)),
          "    ");
    }
  }
  if (!m.equipment.empty()) {
    page.heading("Equipment");
    std::vector<std::vector<std::string>> rows = {{"item", "certificate", "calibrated", "due"}};
    for (const EquipmentItem& each : m.equipment) {
      rows.push_back({page.words(shown(each.id)), page.words(shown(each.certificate)),
                      page.words(shown(each.calibrated)), page.words(shown(each.due))});
    }
    page.table(rows);
  }
}

}  // namespace

std::string to_text(const Measurement& m, const TextStyle& style) {
  TextPage page(style);
  write_head(page, m);
  if (!was_measured(m)) {
    write_refusal(page, m);
    write_advice(page, m);
  }
  write_values(page, m);
  write_points(page, m);
  write_tables(page, m);
  write_composition(page, m);
  write_warnings(page, m);
  if (was_measured(m)) write_advice(page, m);
  if (style.verbose) {
    write_budget(page, m);
    write_origin(page, m);
  }
  return page.take();
}

std::string to_text(const Error& error, const TextStyle& style) {
  std::string text = error.place.empty() ? "" : shown(error.place, 500) + ": ";
  text += shown(error.finding, 2000);
  std::string result = in_script(text, style.script) + '\n';
  if (style.color) result = "\x1b[1;31merror\x1b[0m " + result;
  if (!error.remedy.empty()) result += "  try: " + in_script(shown(error.remedy, 2000), style.script) + '\n';
  return result;
}

}  // namespace coilassay

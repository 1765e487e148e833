#include "report/gauge_text.h"

#include <fmt/format.h>

#include <cmath>

#include "base/outside_text.h"
#include "report/text_layout.h"
#include "report/wording.h"

namespace coilassay {

namespace {

using Rows = std::vector<std::vector<std::string>>;

constexpr std::string_view kIndent = "  ";

std::string percent(double ratio) { return std::isfinite(ratio) ? fmt::format("{:.1f} %", 100 * ratio) : "-"; }

std::string counted(std::size_t n, const char* one, const char* many) { return fmt::format("{} {}", n, n == 1 ? one : many); }

/// Two digits beyond what the interval shows are noise; three are enough for a deviation.
std::string deviation(double value, Unit unit) { return to_text(value, unit, Script::utf8, 3); }

class Page {
 public:
  explicit Page(const TextStyle& style) : style_(style) {}

  void heading(const std::string& text) {
    if (!page_.empty()) page_ += '\n';
    const std::string lines = wrapped(in_script(text, style_.script), "", style_.width);
    page_ += style_.color ? "\x1b[1m" + lines.substr(0, lines.size() - 1) + "\x1b[0m\n" : lines;
  }
  void paragraph(const std::string& text) { page_ += wrapped(in_script(text, style_.script), kIndent, style_.width); }
  void rows(Rows rows) {
    for (auto& row : rows) {
      for (std::string& cell : row) cell = in_script(cell, style_.script);
    }
    page_ += aligned(rows, kIndent);
  }
  std::string take() { return std::move(page_); }

 private:
  const TextStyle& style_;
  std::string page_;
};

Rows components_of(const GaugeRecord& record, bool verbose) {
  const GaugeStudy& study = record.study;
  Rows rows{{"", "deviation", "95 % interval", "of variation"}};
  if (record.tolerance) rows.front().emplace_back("of tolerance");
  if (verbose) rows.front().emplace_back("of variance");
  const bool several = study.operators.size() > 1;
  for (const GaugeComponent& c : study.components) {
    const bool of_operators = c.name == "operator" || c.name == "interaction" || c.name == "reproducibility";
    if (of_operators && !several) continue;
    // Pooled, the operators are all there is of reproducibility.
    if (study.pooled && (c.name == "interaction" || c.name == "operator")) continue;
    rows.push_back({c.name, deviation(c.sigma, record.unit), deviation(c.low, record.unit) + " to " + deviation(c.high, record.unit),
                    percent(std::sqrt(c.share))});
    if (record.tolerance) rows.back().push_back(percent(6 * c.sigma / *record.tolerance));
    if (verbose) rows.back().push_back(percent(c.share));
  }
  return rows;
}

Rows table_of(const GaugeStudy& study) {
  Rows rows{{"source", "dof", "sum of squares", "mean square", "F", "p"}};
  const auto add = [&](const char* name, const VarianceLine& line) {
    if (!(line.dof > 0)) return;
    const auto text = [](double v, const char* form) { return std::isfinite(v) ? fmt::format(fmt::runtime(form), v) : std::string(); };
    rows.push_back({name, fmt::format("{:.0f}", line.dof), text(line.sum_of_squares, "{:.5g}"), text(line.mean_square, "{:.5g}"),
                    text(line.f, "{:.4g}"), text(line.p, "{:.3g}")});
  };
  add("part", study.table.first);
  add("operator", study.table.second);
  add("interaction", study.table.interaction);
  add("within", study.table.within);
  if (study.pooled_within) add("within, pooled", *study.pooled_within);
  return rows;
}

std::string judgement_in_words(const GaugeStudy& study) {
  if (study.judgement == "good") return "The gauge is good.";
  if (study.judgement == "conditional") return "The gauge is conditional: good enough for some uses.";
  return "The gauge is poor: it does not do for this.";
}

}  // namespace

std::string gauge_sheet_lines(const GaugeRecord& record) {
  if (record.quantity.empty()) return {};
  return fmt::format("[gauge]\n{} = \"{}\"\n", record.quantity, to_text(record.study.component("gauge").sigma, record.unit, Script::ascii, 3));
}

std::string to_text(const GaugeRecord& record, const TextStyle& style) {
  const GaugeStudy& study = record.study;
  Page page(style);
  std::string what = record.quantity.empty() ? "Gauge study" : "Gauge study of " + record.quantity;
  if (!record.conditions.empty()) what += " " + record.conditions;
  page.heading(fmt::format("{}: {}, {}, {}", what, counted(study.parts.size(), "part", "parts"), counted(study.operators.size(), "operator", "operators"),
                           counted(study.trials.size(), "trial", "trials")));
  page.rows(components_of(record, style.verbose));
  page.heading(judgement_in_words(study));
  const auto interval = [](const WithInterval& v) { return fmt::format("{} ({} to {})", percent(v.value), percent(v.low), percent(v.high)); };
  Rows rows{{"%GRR of the study", interval(study.grr_of_study)}};
  if (study.grr_of_tolerance) {
    rows.push_back({"%GRR of the tolerance", interval(*study.grr_of_tolerance)});
  }
  rows.push_back({"categories (ndc)", fmt::format("{} ({:.1f}; {:.1f} to {:.1f})", study.ndc, study.categories.value, study.categories.low, study.categories.high)});
  page.rows(rows);
  for (const std::string& sentence : study.why) page.paragraph(sentence + ".");
  if (!record.findings.empty()) {
    page.heading("To know");
    for (const Finding& finding : by_weight(record.findings)) {
      page.paragraph(fmt::format("{}: {}", name(finding.severity), finding.message));
    }
  }
  page.heading("Analysis of variance");
  page.rows(table_of(study));
  if (study.operators.size() > 1) {
    page.paragraph(study.pooled ? "Part and operator do not interact beyond chance: the interaction is pooled with the readings within."
                                : "Part and operator interact: some operators read some parts differently.");
  }
  if (const std::string lines = gauge_sheet_lines(record); !lines.empty()) {
    page.heading("For the part sheet");
    std::string text = lines;
    for (std::size_t begin = 0; begin < text.size();) {
      const std::size_t end = text.find('\n', begin);
      page.rows({{text.substr(begin, end - begin)}});
      begin = end + 1;
    }
  }
  if (style.verbose) {
    page.heading("Readings");
    Rows readings;
    for (const GaugeReading& r : record.readings) {
      readings.push_back({shown(r.part, 30), shown(r.operator_name, 30), shown(r.trial, 30), to_text(r.value, record.unit, Script::utf8, 6)});
    }
    page.rows(readings);
    page.heading("Sources");
    Rows files;
    for (const GaugeRecord::File& file : record.files) files.push_back({shown(file.file), file.sha256});
    page.rows(files);
  }
  return page.take();
}

}  // namespace coilassay

// The units in a lot's report, one by one, and how they were measured.
#include <fmt/format.h>

#include <cmath>

#include "base/outside_text.h"
#include "report/figure.h"
#include "report/lot_report.h"
#include "report/lot_wording.h"
#include "report/wording.h"

namespace coilassay {

namespace {

constexpr Script kScript = Script::utf8;

/// A shape beside the word: it is found when leafing through, in grey too.
std::string marked(Verdict verdict) {
  const std::string word(verdict_in_words(verdict));
  switch (verdict) {
    case Verdict::pass: return "\u2713 " + word;
    case Verdict::fail: return "\u2717 " + word;
    case Verdict::undecided: return "? " + word;
    case Verdict::not_comparable: return "\u2013 " + word;
  }
  return word;
}

std::string attempts_in_words(const LotUnitRecord& unit) {
  if (unit.made <= 1) return "";
  return fmt::format("{} attempts, {} of them counted", unit.made, unit.counted);
}

void write_limits(HtmlBuilder& page, const LotUnitRecord& unit) {
  std::vector<std::vector<std::string>> rows;
  for (const LimitVerdict& limit : unit.verdict.limits) {
    rows.push_back({limit.quantity, value_in_words(limit, kScript), limits_in_words(limit, kScript),
                    limit.guard && *limit.guard > 0 ? to_text(*limit.guard, limit.unit, kScript, 2) : "none",
                    probability_in_words(limit), marked(limit.verdict)});
  }
  page.table({"Quantity", "Value, 95 % interval", "Limits", "Guard band", "Probability that it conforms", "Verdict"}, rows,
             "details");
  page.open("ul");
  for (const LimitVerdict& limit : unit.verdict.limits) {
    if (limit.verdict != Verdict::pass && !limit.why.empty()) {
      page.open("li").symbol(limit.quantity).text(": ").text(limit.why).close();
    }
  }
  page.close();
}

std::string stated_in_words(const StatedValue& value) {
  std::string words = setting_in_words(value.value, value.unit, kScript);
  if (value.law == Law::rectangular) words += " ± " + setting_in_words(value.half_width, value.unit, kScript);
  if (value.law == Law::normal) words += fmt::format(" ± {} (k=2)", setting_in_words(2 * value.standard_uncertainty, value.unit, kScript));
  return words;
}

void write_budget(HtmlBuilder& page, const LotRecord& lot, const LotTestRecord& test) {
  for (const Limit& limit : lot.sheet.limits) {
    if (!test.example || !test.example->budget.contains(limit.quantity)) continue;
    std::vector<std::vector<std::string>> rows;
    for (const BudgetLine& line : by_share(test.example->budget.at(limit.quantity))) {
      rows.push_back({line.source, std::string(1, line.kind), to_text(line.u, limit.unit, kScript, 2),
                      share_in_words(line.share), line.common ? "all units" : "each unit", line.basis});
    }
    page.open("h3").symbol(limit.quantity).text(" of unit " + shown(test.example_serial, 60) + ": what its uncertainty is made of").close();
    page.table({"Source", "Type", "u", "Share", "The same for", "Basis"}, rows, "budget");
  }
}

void write_test(HtmlBuilder& page, const LotRecord& lot, const LotTestRecord& test) {
  page.element("h3", test_in_words(test.kind) + (test.test == test.kind ? "" : " (" + shown(test.test, 60) + ")"));
  page.open("dl");
  const auto entry = [&page](std::string_view term, std::string_view text) {
    if (!text.empty()) page.element("dt", term).element("dd", text);
  };
  if (test.example && test.example->model) entry("Model", test.example->model->name);
  if (test.example) {
    entry("Conditions", fmt::format("{}", fmt::join(conditions_in_words(test.example->conditions, kScript), ", ")));
    std::string corrections;
    for (const Correction& each : test.example->corrections) {
      corrections += (corrections.empty() ? "" : ", ") + each.name + ' ' + to_text(each.value, each.unit, kScript);
    }
    entry("Corrections", corrections.empty() ? "none" : corrections);
  }
  entry("Room", test.room_temperature ? stated_in_words(*test.room_temperature) : "temperature not stated");
  if (test.bench) entry("Bench sheet", shown(*test.bench) + ", SHA-256 " + test.bench_sha256);
  page.close();
  if (!test.equipment.empty()) {
    std::vector<std::vector<std::string>> rows;
    for (const EquipmentItem& each : test.equipment) rows.push_back({each.id, each.certificate, each.calibrated, each.due});
    page.table({"Item", "Certificate", "Calibrated", "Due"}, rows, "equipment");
  }
  write_budget(page, lot, test);
}

}  // namespace

void write_units_in_detail(HtmlBuilder& page, const LotRecord& lot) {
  const auto units = not_passing(lot);
  if (units.empty()) return;
  page.open("section").element("h2", "Units that do not pass, one by one");
  std::size_t drawn = 0;
  for (const LotUnitRecord* unit : units) {
    page.open("div", {{"class", "unit"}});
    page.element("h3", fmt::format("Unit {}: {}", shown(unit->verdict.serial, 60), verdict_in_words(unit->verdict.verdict)));
    if (const std::string attempts = attempts_in_words(*unit); !attempts.empty()) page.element("p", attempts);
    write_limits(page, *unit);
    for (const Measurement& each : unit->shown) {
      const std::string prefix = "u" + std::to_string(drawn++);
      for (const Finding& finding : by_weight(each.findings)) {
        if (finding.severity == Severity::note) continue;
        page.element("p", std::string(name(finding.severity)) + ": " + finding.message);
      }
      const Figure figure = figure_of(each);
      write_figure(page, figure, prefix, figure.panels.size() > 2 ? "tall" : "short");
    }
    page.close();
  }
  page.close();
}

void write_measuring(HtmlBuilder& page, const LotRecord& lot) {
  page.open("section").element("h2", "How the units were measured");
  for (const LotTestRecord& each : lot.tests) write_test(page, lot, each);
  page.element("p",
               "u is what a source contributes to the standard uncertainty, its share is of the variance. Type A comes "
               "from the scatter of the data, type B from a stated tolerance or a named default. What is the same for all "
               "units moves the whole lot together and is no part of their spread.",
               {{"class", "small"}});
  page.open("p", {{"class", "small"}});
  page.text("Part sheet ").text(shown(lot.sheet.path)).text(", SHA-256 ").element("span", lot.sheet.sha256, {{"class", "hash"}});
  page.close().close();
}

void write_all_units(HtmlBuilder& page, const LotRecord& lot) {
  if (lot.units.empty()) return;
  page.open("section").element("h2", "All units");
  std::vector<std::string> head = {"Unit"};
  for (const Limit& limit : lot.sheet.limits) head.push_back(limit.quantity);
  head.emplace_back("P");
  head.emplace_back("Verdict");
  std::vector<std::vector<std::string>> rows;
  for (const LotUnitRecord& unit : lot.units) {
    std::vector<std::string> row = {shown(unit.verdict.serial, 40) + (unit.in_sample ? "" : " *")};
    const LimitVerdict* worst = nullptr;
    for (const LimitVerdict& limit : unit.verdict.limits) {
      row.push_back(value_in_words(limit, kScript));
      if (limit.p_conform && (worst == nullptr || *limit.p_conform < *worst->p_conform)) worst = &limit;
    }
    row.push_back(worst != nullptr ? probability_in_words(*worst) : "");
    row.push_back(marked(unit.verdict.verdict));
    rows.push_back(std::move(row));
  }
  page.table(head, rows, "units");
  std::string legend = "Values with their 95 % intervals; P is the probability that the unit keeps the limit it is nearest to breaking, given its value.";
  for (const LotUnitRecord& unit : lot.units) {
    if (unit.in_sample) continue;
    legend += " Units with a star were measured besides the sample and do not decide.";
    break;
  }
  page.element("p", legend, {{"class", "small"}}).close();
}

void write_all_files(HtmlBuilder& page, const LotRecord& lot) {
  std::vector<std::vector<std::string>> rows;
  for (const LotUnitRecord& unit : lot.units) {
    for (const LotFile& file : unit.files) {
      rows.push_back({shown(unit.verdict.serial, 40), shown(file.test, 40), shown(file.file), file.sha256});
    }
  }
  if (rows.empty()) return;
  page.open("section").element("h2", "Files").table({"Unit", "Test", "File", "SHA-256"}, rows, "files").close();
}

}  // namespace coilassay

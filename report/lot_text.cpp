#include "report/lot_text.h"

#include <fmt/format.h>

#include "base/outside_text.h"
#include "report/lot_wording.h"
#include "report/text_page.h"
#include "report/wording.h"

namespace coilassay {

namespace {

void write_decision(TextPage& page, const LotRecord& lot) {
  page.heading(fmt::format("{}: {}", decision_in_words(lot.decision.decision), lot_in_words(lot)));
  if (!lot.decision.why.empty()) page.paragraph(shown(lot.decision.why, 1000));
}

/// Why a unit does not pass, a sentence for each limit; limits without a value for the same reason together.
std::vector<std::string> reasons(const UnitVerdict& unit, Script script) {
  std::vector<std::string> sentences;
  std::string symbols, why;
  Verdict verdict = Verdict::undecided;
  const auto flush = [&] {
    const char* form = verdict == Verdict::not_comparable ? "{} cannot be compared: {}" : "no value of {}: {}";
    if (!symbols.empty()) sentences.push_back(fmt::format(fmt::runtime(form), symbols, shown(why, 600)));
    symbols.clear();
  };
  for (const LimitVerdict& limit : unit.limits) {
    if (limit.verdict == Verdict::pass) continue;
    if (!limit.value) {
      if (limit.why != why || limit.verdict != verdict) flush();
      verdict = limit.verdict;
      symbols += (symbols.empty() ? "" : ", ") + limit.quantity;
      why = limit.why;
      continue;
    }
    const std::string probability = probability_in_words(limit);
    sentences.push_back(fmt::format("{} {}, limits {}: {}{}", limit.quantity, value_in_words(limit, script),
                                    limits_in_words(limit, script), shown(limit.why, 600),
                                    probability.empty() ? "" : "; it conforms with a probability of " + probability));
  }
  flush();
  return sentences;
}

void write_units(TextPage& page, const LotRecord& lot) {
  constexpr std::size_t kUnits = 20;
  const auto units = not_passing(lot);
  if (units.empty()) return;
  const Script script = page.style().script;
  page.heading(fmt::format("Units that do not pass ({} of {})", units.size(), lot.units.size()));
  const std::size_t shown_units = page.style().verbose ? units.size() : std::min(units.size(), kUnits);
  std::size_t widest = 0;
  for (std::size_t i = 0; i < shown_units; ++i) {
    widest = std::max(widest, display_width(shown(units[i]->verdict.serial, 40)));
  }
  for (std::size_t i = 0; i < shown_units; ++i) {
    const LotUnitRecord& unit = *units[i];
    std::string first = std::string(kTextIndent) + padded(page.words(shown(unit.verdict.serial, 40)), widest + 2) +
                        padded(verdict_in_words(unit.verdict.verdict), 16);
    const std::string further(display_width(first), ' ');
    const auto whys = reasons(unit.verdict, script);
    for (const std::string& each : whys) {
      page.paragraph(each, first);
      first = further;
    }
    if (whys.empty()) page.paragraph("its values pass; a correction in the ledger says otherwise", first);
    if (!unit.in_sample) page.paragraph("measured besides the sample", first);
  }
  if (units.size() > shown_units) page.paragraph(fmt::format("and {} more with --verbose", units.size() - shown_units));
}

void write_plan(TextPage& page, const LotRecord& lot) {
  page.heading("How it was decided");
  if (lot.plan) {
    page.paragraph(shown(lot.plan->why, 600), "  Plan:     ");
    if (const std::string protection = protection_in_words(lot); !protection.empty()) {
      page.paragraph(protection, "            ");
    }
  }
  page.paragraph(rule_in_words(lot.sheet.decision), "  Rule:     ");
  if (lot.plan && (lot.plan->scheme == SamplingScheme::attributes || lot.plan->scheme == SamplingScheme::variables)) {
    std::string severity = std::string(name(lot.plan->severity));
    if (!lot.severity_why.empty()) severity += " (" + shown(lot.severity_why, 300) + ")";
    if (lot.next) severity += "; the next lot: " + std::string(name(lot.next->severity));
    page.paragraph(severity, "  Severity: ");
  }
}

void write_values(TextPage& page, const LotRecord& lot) {
  if (lot.statistics.empty()) return;
  page.heading("Values of the lot");
  std::size_t widest = 0;
  for (const LotValues& each : lot.statistics) widest = std::max(widest, each.quantity.size());
  for (const LotValues& each : lot.statistics) {
    page.paragraph(values_in_words(each, page.style().script), std::string(kTextIndent) + padded(each.quantity, widest + 2));
    const std::string capability = capability_in_words(each);
    if (!capability.empty()) page.paragraph(capability, std::string(widest + 4, ' '));
  }
}

void write_warnings(TextPage& page, const LotRecord& lot) {
  const auto findings = findings_to_tell(lot);
  if (findings.empty() && lot.cautions.empty()) return;
  page.heading("What to watch out for");
  for (const Finding& each : findings) page.remark(each.severity, shown(each.message, 1000));
  for (const Caution& each : lot.cautions) {
    const std::string figure = figure_in_words(each, page.style().script);
    page.remark(each.severity, shown(each.message, 1000) + (figure.empty() ? "" : " (" + figure + ")"));
  }
}

}  // namespace

std::string to_text(const LotRecord& lot, const TextStyle& style) {
  TextPage page(style);
  write_decision(page, lot);
  write_units(page, lot);
  write_plan(page, lot);
  write_values(page, lot);
  write_warnings(page, lot);
  page.heading("Record");
  page.paragraph(record_in_words(lot));
  return page.take();
}

std::string to_text(const SheetCheck& check, const TextStyle& style) {
  TextPage page(style);
  std::string head = "Part sheet " + shown(check.path) + ": " + shown(check.part, 80);
  if (!check.revision.empty()) head += ", revision " + shown(check.revision, 40);
  page.heading(head);
  for (const std::string& each : check.sentences) page.paragraph(shown(each, 1000));
  if (check.problems.empty()) {
    page.paragraph("No contradiction was found.");
    return page.take();
  }
  page.heading(check.usable() ? "What is worth a look" : "What cannot work, or is worth a look");
  for (const SheetProblem& each : check.problems) {
    page.remark(each.contradiction ? Severity::refusal : Severity::caution,
                shown(each.place) + ": " + shown(each.finding, 1000) + (each.remedy.empty() ? "" : "; " + shown(each.remedy, 600)));
  }
  return page.take();
}

}  // namespace coilassay

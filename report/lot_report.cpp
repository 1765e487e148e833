#include "report/lot_report.h"

#include <fmt/format.h>

#include "base/outside_text.h"
#include "report/lot_figures.h"
#include "report/lot_wording.h"
#include "report/page_style.h"
#include "report/wording.h"

namespace coilassay {

namespace {

constexpr Script kScript = Script::utf8;

constexpr std::string_view kLotStyle = R"css(
.decision { border: 3px solid #1b1f24; padding: .7rem 1rem; margin: 1rem 0; }
.decision p { margin: .25rem 0; }
.decision strong { font-size: 1.6rem; letter-spacing: .02em; }
.units, .details, .files { font-size: .85rem; }
.units td, .units th { padding-right: .7rem; }
.units td:last-child, .units td:nth-last-child(2) { white-space: nowrap; }
.files td:last-child { font-family: "DejaVu Sans Mono", monospace; font-size: .7rem; word-break: break-all; }
.files td:last-child, .files th:last-child { width: 52%; }
.unit { border-top: 1.5px solid #4a535c; margin-top: 1.25rem; }
.sign { display: grid; grid-template-columns: 1fr 1fr 1fr; gap: 2rem; margin-top: 2.5rem; break-inside: avoid; }
.sign p { border-top: 1px solid #1b1f24; padding-top: .25rem; color: #4a535c; font-size: .85rem; }
.hash { font-family: "DejaVu Sans Mono", monospace; font-size: .75rem; word-break: break-all; }
@media print { .unit h3 { break-after: avoid; } figure.lot svg { width: 100%; max-height: 100mm; } .quantity { break-inside: avoid; } .units tr { break-inside: avoid; } }
)css";

/// A text between quotes in a style sheet: everything but letters and digits as its number.
std::string css_text(std::string_view outside) {
  std::string text;
  for (const char c : shown(outside, 80)) {
    const bool plain = (c >= '0' && c <= '9') || (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z');
    if (plain) text += c;
    else if (static_cast<unsigned char>(c) < 0x80) text += fmt::format("\\{:06x}", static_cast<unsigned>(c));
    else text += c;  // part of a valid character, which shown() has made sure of
  }
  return text;
}

/// Report number and page n of N at the foot of every printed page.
std::string page_numbers(const LotRecord& lot) {
  return fmt::format(
      "@page {{ @bottom-left {{ content: \"Report {}\"; font-size: 8pt; color: #4a535c; }} @bottom-right {{ content: "
      "\"page \" counter(page) \" of \" counter(pages); font-size: 8pt; color: #4a535c; }} }}\n",
      css_text(lot.report_number()));
}

void write_decision(HtmlBuilder& page, const LotRecord& lot) {
  page.open("div", {{"class", "decision"}}).open("p");
  page.element("strong", decision_in_words(lot.decision.decision)).close();
  if (!lot.decision.why.empty()) page.element("p", lot.decision.why);
  if (lot.plan) {
    const LotCounts& counts = lot.decision.counts;
    page.element("p", fmt::format("{} of {} units measured decide; {} of them nonconforming, {} undecided, {} not "
                                  "comparable. The lot has {} units.",
                                  counts.inspected, lot.units.size(), counts.nonconforming, counts.undecided,
                                  counts.not_comparable, lot.lot_size));
  }
  page.close();
}

void write_not_passing(HtmlBuilder& page, const LotRecord& lot) {
  const auto units = not_passing(lot);
  if (units.empty()) return;
  page.open("section").element("h2", "Units that do not pass");
  std::vector<std::vector<std::string>> rows;
  for (const LotUnitRecord* unit : units) {
    for (const LimitVerdict& limit : unit->verdict.limits) {
      if (limit.verdict == Verdict::pass) continue;
      rows.push_back({shown(unit->verdict.serial, 60), std::string(verdict_in_words(limit.verdict)), limit.quantity,
                      value_in_words(limit, kScript), limits_in_words(limit, kScript), probability_in_words(limit)});
    }
  }
  page.table({"Unit", "Verdict", "Quantity", "Value, 95 % interval", "Limits", "Conforms with"}, rows, "details").close();
}

void write_plan(HtmlBuilder& page, const LotRecord& lot) {
  page.open("section").element("h2", "How it was decided").open("dl");
  const auto entry = [&page](std::string_view term, std::string_view text) {
    if (!text.empty()) page.element("dt", term).element("dd", text);
  };
  if (lot.plan) {
    entry("Plan", lot.plan->why);
    entry("Protection", protection_in_words(lot));
    if (lot.plan->scheme != SamplingScheme::all) {
      entry("Draw", fmt::format("units drawn at random from those present with seed {}", lot.plan->draw_seed));
    }
    if (lot.plan->scheme == SamplingScheme::attributes || lot.plan->scheme == SamplingScheme::variables) {
      std::string severity = std::string(name(lot.plan->severity));
      if (!lot.severity_why.empty()) severity += ": " + lot.severity_why;
      entry("Severity", severity);
      if (lot.next) {
        entry("Next lot", std::string(name(lot.next->severity)) + (lot.next->why.empty() ? "" : ": " + lot.next->why));
      }
    }
  }
  entry("Rule", rule_in_words(lot.sheet.decision));
  page.close();
  page.element("h3", "Limits");
  std::vector<std::vector<std::string>> rows;
  for (const Limit& limit : lot.sheet.limits) {
    rows.push_back({limit.quantity, limits_in_words(limit), conditions_in_words(limit.at),
                    limit.test.empty() ? "any that fits" : limit.test});
  }
  page.table({"Quantity", "Limits", "Conditions", "Test"}, rows, "details");
  write_figure(page, operating_figure(lot), "oc", "short");
  page.close();
}

void write_values(HtmlBuilder& page, const LotRecord& lot) {
  if (lot.statistics.empty()) return;
  page.open("section").element("h2", "Values of the lot");
  for (const LotValues& each : lot.statistics) {
    page.open("div", {{"class", "quantity"}});
    page.open("h3").symbol(each.quantity).close();
    page.element("p", values_in_words(each, kScript) + ".");
    if (const std::string capability = capability_in_words(each); !capability.empty()) page.element("p", capability + ".");
    const std::string number = std::to_string(each.limit);
    write_figure(page, lot_values_figure(lot, each.limit), "v" + number, "lot");
    page.close();
  }
  page.element("p",
               "The interval of the mean holds the scatter of the units and the errors common to all of them (standards, "
               "gains), which no number of units averages out. Cp and Cpk are from the scatter between neighbours, Pp and Ppk from that of "
               "all units, each with its 95 % interval.",
               {{"class", "small"}});
  page.close();
}

void write_remarks(HtmlBuilder& page, const LotRecord& lot) {
  page.open("section").element("h2", "What to watch out for");
  const auto findings = findings_to_tell(lot);
  if (findings.empty() && lot.cautions.empty()) page.element("p", "Nothing was found that a reader would have to know.");
  else page.open("ul", {{"class", "remarks"}});
  const auto item = [&page](Severity severity, std::string_view message, std::string_view after) {
    page.open("li", {{"class", name(severity)}}).element("strong", name(severity)).text(" ").text(message);
    if (!after.empty()) page.text(" ").element("span", after, {{"class", "small"}});
    page.close();
  };
  for (const Finding& each : findings) item(each.severity, each.message, "[" + each.code + "]");
  for (const Caution& each : lot.cautions) {
    const std::string figure = figure_in_words(each, kScript);
    item(each.severity, each.message, figure.empty() ? "" : "(" + figure + ")");
  }
  if (!findings.empty() || !lot.cautions.empty()) page.close();
  if (lot.check) {
    page.element("h3", "Check standard").element("p", lot.check->why);
    write_figure(page, check_figure(lot), "cs", "short");
  }
  page.close();
}

void write_record(HtmlBuilder& page, const LotRecord& lot) {
  page.open("section").element("h2", "Record and signature").open("dl");
  const auto entry = [&page](std::string_view term, std::string_view text) {
    if (!text.empty()) page.element("dt", term).element("dd", text);
  };
  entry("Inspected", to_text(lot.when) + (lot.operator_name.empty() ? "" : " by " + shown(lot.operator_name, 80)));
  entry("Program", lot.program);
  if (lot.ledger && lot.ledger->last > 0) {
    entry("Ledger", fmt::format("{}, entries {} to {}", shown(lot.ledger->file), lot.ledger->first, lot.ledger->last));
  }
  if (lot.ledger && lot.ledger->replaces) {
    entry("Replaces", fmt::format("report {}-{}", shown(lot.lot, 80), *lot.ledger->replaces));
  }
  if (lot.ledger) page.element("dt", "Last hash").element("dd", lot.ledger->head, {{"class", "hash"}});
  page.close();
  if (!lot.ledger) page.element("p", record_in_words(lot));
  page.open("div", {{"class", "sign"}});
  for (const char* each : {"Inspected by", "Released by", "Date"}) page.element("p", each);
  page.close().close();
}

}  // namespace

void write_figure(HtmlBuilder& page, const Figure& figure, const std::string& prefix, std::string_view css_class) {
  if (figure.panels.empty()) return;
  if (const auto svg = draw_svg(figure, prefix)) {
    page.open("figure", {{"class", css_class}})
        .own_markup(std::string_view(*svg).substr(svg->find("<svg")))
        .close();
  } else {
    page.element("p", "There is no figure here: " + svg.error().finding + ". To have one: " + svg.error().remedy +
                          ". The numbers do not depend on it.");
  }
}

std::string lot_report(const LotRecord& lot) {
  HtmlBuilder page;
  const std::string title = "Inspection of " + lot_in_words(lot);
  page.own_markup("<!DOCTYPE html>\n").open("html", {{"lang", "en"}}).open("head");
  page.empty("meta", {{"charset", "utf-8"}});
  page.empty("meta", {{"http-equiv", "Content-Security-Policy"},
                      {"content", "default-src 'none'; style-src 'unsafe-inline'; img-src data:"}});
  page.empty("meta", {{"name", "viewport"}, {"content", "width=device-width, initial-scale=1"}});
  page.element("title", title).open("style").own_markup(kPageStyle).own_markup(kLotStyle);
  page.own_markup(page_numbers(lot)).close().close();

  page.open("body").open("header").element("h1", title);
  page.open("p").text("Report ").text(shown(lot.report_number(), 80)).text(", ").text(to_text(lot.when));
  if (!lot.operator_name.empty()) page.text(", inspected by ").text(shown(lot.operator_name, 80));
  page.close();
  if (!lot.sheet.description.empty()) page.element("p", shown(lot.sheet.description, 300));
  if (lot.ledger && lot.ledger->replaces) {
    page.element("p", fmt::format("Amendment: it replaces report {}-{}.", shown(lot.lot, 80), *lot.ledger->replaces));
  }
  page.close().open("main");
  write_decision(page, lot);
  write_not_passing(page, lot);
  write_plan(page, lot);
  write_values(page, lot);
  write_remarks(page, lot);
  write_all_units(page, lot);
  write_units_in_detail(page, lot);
  write_measuring(page, lot);
  write_all_files(page, lot);
  write_record(page, lot);
  page.close();
  page.open("footer").element("p", "This report relates only to the units listed.").close().close().close();
  return page.finish();
}

}  // namespace coilassay

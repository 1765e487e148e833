#include "report/ledger_text.h"

#include <cmath>
#include <nlohmann/json.hpp>

#include "analysis/symbols.h"
#include "base/outside_text.h"
#include "report/text_layout.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;
using Rows = std::vector<std::vector<std::string>>;
constexpr std::string_view kIndent = "  ";

void add_heading(const std::string& text, const TextStyle& style, std::string& page) {
  if (!page.empty()) page += '\n';
  const std::string line = in_script(text, style.script);
  page += style.color ? "\x1b[1m" + line + "\x1b[0m\n" : line + "\n";
}

void add_rows(Rows rows, const TextStyle& style, std::string& page) {
  for (auto& row : rows) {
    for (std::string& cell : row) cell = in_script(cell, style.script);
  }
  page += aligned(rows, kIndent);
}

void add_facts(const Rows& facts, const TextStyle& style, std::string& page) {
  std::size_t widest = 0;
  for (const auto& fact : facts) widest = std::max(widest, display_width(fact[0]));
  for (const auto& fact : facts) {
    page += wrapped(in_script(fact[1], style.script), std::string(kIndent) + padded(fact[0], widest + 2), style.width);
  }
}

/// "unit 0017 of lot 0412, attempt 2: fail"
std::string subject_of(const EntryContent& c) {
  std::string text;
  switch (c.kind) {
    case EntryKind::unit: text = "unit " + shown(c.serial, 60) + ", attempt " + std::to_string(c.attempt) + ", of lot " + shown(c.lot, 60); break;
    case EntryKind::lot: text = "lot " + shown(c.lot, 60); break;
    case EntryKind::check: text = "check standard " + shown(c.serial, 60); break;
    case EntryKind::correction: text = "correction of entry " + std::to_string(*c.corrects); break;
  }
  return c.verdict.empty() ? text : text + ": " + shown(c.verdict, 40);
}

std::string dash(const std::string& text, std::size_t most = 24) { return text.empty() ? "-" : shown(text, most); }

std::string quantity_text(const Json& limit, const char* member, Script script) {
  const auto value = limit.find(member);
  if (value == limit.end() || !value->is_number()) return "-";
  const auto quantity = limit.find("quantity");
  const Symbol* symbol = quantity != limit.end() && quantity->is_string() ? find_symbol(quantity->get<std::string>()) : nullptr;
  return to_text(value->get<double>(), symbol != nullptr ? symbol->unit : Unit::one, script);
}

std::string word_of(const Json& limit, const char* member) {
  const auto value = limit.find(member);
  return value != limit.end() && value->is_string() ? shown(value->get<std::string>(), 300) : std::string("-");
}

void add_limits(const EntryContent& content, const TextStyle& style, std::string& page) {
  const Json details = Json::parse(content.details, nullptr, false);
  if (!details.is_object() || !details.contains("limits") || !details["limits"].is_array() || details["limits"].empty()) return;
  add_heading("Limits", style, page);
  Rows rows{{"quantity", "value", "± U", "min", "max", "verdict"}};
  std::string why;
  for (const Json& limit : details["limits"]) {
    if (!limit.is_object()) continue;
    rows.push_back({word_of(limit, "quantity"), quantity_text(limit, "value", style.script), quantity_text(limit, "U", style.script),
                    quantity_text(limit, "min", style.script), quantity_text(limit, "max", style.script), word_of(limit, "verdict")});
    if (const std::string words = word_of(limit, "why"); words != "-" && words != "") {
      why += wrapped(in_script(words, style.script), std::string(kIndent) + padded(word_of(limit, "quantity"), 10), style.width);
    }
  }
  add_rows(std::move(rows), style, page);
  page += why;
}

std::string count_of(const Json& details, const char* member) {
  const auto value = details.find(member);
  return value != details.end() && value->is_number_integer() ? std::to_string(value->get<std::int64_t>()) : std::string("-");
}

/// Of a lot: the plan, what was counted, and why it was decided so. Of a check standard: what was read.
void add_decision(const EntryContent& content, const TextStyle& style, std::string& page) {
  const Json details = Json::parse(content.details, nullptr, false);
  if (!details.is_object()) return;
  Rows facts;
  if (const auto plan = details.find("plan"); plan != details.end() && plan->is_object()) {
    facts.push_back({"plan", word_of(*plan, "scheme") + ", " + word_of(*plan, "severity") + ", n " + count_of(*plan, "n") + ", accept " +
                                 count_of(*plan, "accept") + ", reject " + count_of(*plan, "reject")});
  }
  if (details.contains("inspected")) {
    facts.push_back({"counted", count_of(details, "inspected") + " of " + count_of(details, "lot_size") + " inspected, " +
                                    count_of(details, "nonconforming") + " nonconforming, " + count_of(details, "undecided") + " undecided"});
  }
  if (const std::string why = word_of(details, "why"); why != "-") facts.push_back({"why", why});
  if (content.kind == EntryKind::check && details.contains("value")) {
    facts.push_back({word_of(details, "quantity"), quantity_text(details, "value", style.script) + ", standard uncertainty " +
                                                       quantity_text(details, "u", style.script)});
  }
  if (facts.empty()) return;
  add_heading(content.kind == EntryKind::check ? "Reading" : "Decision", style, page);
  add_facts(facts, style, page);
}

/// Findings of the verdict, and of each test.
void add_findings(const EntryContent& content, const TextStyle& style, std::string& page) {
  const Json details = Json::parse(content.details, nullptr, false);
  if (!details.is_object()) return;
  std::string found;
  const auto add = [&](const Json& from) {
    const auto list = from.find("findings");
    if (list == from.end() || !list->is_array()) return;
    for (const Json& each : *list) {
      if (!each.is_object()) continue;
      found += wrapped(in_script(word_of(each, "message"), style.script), std::string(kIndent) + padded(word_of(each, "severity"), 9), style.width);
    }
  };
  add(details);
  if (const auto tests = details.find("tests"); tests != details.end() && tests->is_array()) {
    for (const Json& test : *tests) {
      if (test.is_object() && test.contains("result") && test["result"].is_object()) add(test["result"]);
    }
  }
  if (found.empty()) return;
  add_heading("What to watch out for", style, page);
  page += found;
}

/// Captures, and the sheets that say what they mean.
void add_files(const EntryContent& content, const TextStyle& style, std::string& page) {
  Rows files;
  for (const EntrySource& source : content.sources) files.push_back({dash(source.test), shown(source.file, 200), source.sha256});
  const Json details = Json::parse(content.details, nullptr, false);
  const bool tests = details.is_object() && details.contains("tests") && details["tests"].is_array();
  for (const Json& test : tests ? details["tests"] : Json::array()) {
    const auto bench = test.is_object() ? test.find("bench") : test.end();
    if (!test.is_object() || bench == test.end() || !bench->is_object()) continue;
    files.push_back({word_of(test, "test") + ", bench", word_of(*bench, "file"), word_of(*bench, "sha256")});
  }
  if (files.empty()) return;
  add_heading("Files", style, page);
  add_rows(std::move(files), style, page);
}

/// What a correction changed, in words; `before`: what stood until then.
std::string changes_of(const EntryContent& before, const EntryContent& after) {
  std::string words;
  const auto add = [&words](const char* what, const std::string& old, const std::string& now) {
    if (old != now) words += (words.empty() ? "" : ", ") + std::string(what) + " " + dash(old, 60) + " is " + dash(now, 60);
  };
  add("serial", before.serial, after.serial);
  add("lot", before.lot, after.lot);
  add("supplier", before.supplier, after.supplier);
  add("verdict", before.verdict, after.verdict);
  return words.empty() ? "changes nothing" : words;
}

}  // namespace

std::string list_text(std::span<const Entry> entries, const std::string& file, const LedgerHead& head, const TextStyle& style) {
  std::string page;
  if (entries.empty()) {
    page = in_script(shown(file), style.script) + (head.id == 0 ? ": no entry yet\n" : ": no entry is like that\n");
  } else {
    Rows rows{{"entry", "time", "kind", "lot", "serial", "attempt", "verdict", ""}};
    for (const Entry& entry : entries) {
      const EntryContent& c = entry.content;
      const std::string mark = c.corrects                ? "corrects " + std::to_string(*c.corrects)
                               : entry.corrected_by ? "corrected by " + std::to_string(*entry.corrected_by)
                                                         : "";
      rows.push_back({std::to_string(entry.id), to_text(c.time), std::string(name(c.kind)), dash(c.lot), dash(c.serial),
                      c.attempt > 0 ? std::to_string(c.attempt) : "-", dash(c.verdict), mark});
    }
    add_rows(std::move(rows), style, page);
  }
  page += "\nhead: entry " + std::to_string(head.id) + ", " + head.hash + "\n";
  return page;
}

std::string entry_text(const Entry& entry, std::span<const Entry> corrections, const TextStyle& style) {
  const EntryContent& c = entry.content;
  std::string page;
  add_heading("Entry " + std::to_string(entry.id) + ": " + subject_of(c), style, page);
  Rows facts{{"recorded", to_text(c.time) + (c.operator_name.empty() ? "" : " by " + shown(c.operator_name, 80)) +
                              (c.program.empty() ? "" : " with " + shown(c.program, 80))},
             {"part", shown(c.part, 80) + (c.revision.empty() ? "" : ", revision " + shown(c.revision, 40)) +
                          (c.supplier.empty() ? "" : ", from " + shown(c.supplier, 80))}};
  if (!c.instrument.empty()) facts.push_back({"instrument", shown(c.instrument, 200)});
  if (!c.reason.empty()) facts.push_back({"reason", shown(c.reason, 1000)});
  if (!c.sheet_sha256.empty()) facts.push_back({"sheet", c.sheet_sha256});
  if (c.kind == EntryKind::correction) {
    facts.push_back({"now", "serial " + dash(c.serial, 60) + ", lot " + dash(c.lot, 60) + ", supplier " + dash(c.supplier, 60) +
                                ", verdict " + dash(c.verdict, 60)});
  }
  add_facts(facts, style, page);
  add_limits(c, style, page);
  add_decision(c, style, page);
  add_findings(c, style, page);
  add_files(c, style, page);
  if (!corrections.empty()) {
    add_heading("Corrections", style, page);
    EntryContent before = c;
    for (const Entry& each : corrections) {
      page += wrapped(in_script(to_text(each.content.time) + ": " + changes_of(before, each.content) + ". " + shown(each.content.reason, 1000),
                                style.script),
                      std::string(kIndent) + "entry " + std::to_string(each.id) + "  ", style.width);
      before = each.content;
    }
  }
  add_heading("Chain", style, page);
  add_rows({{"previous", entry.previous}, {"hash", entry.hash}}, style, page);
  return page;
}

std::string again_text(const MeasuredAgain& again, const TextStyle& style) {
  std::string page = "\n";
  page += in_script("Measured again", style.script) + "\n";
  const std::string from = again.files == 1 ? "one file" : std::to_string(again.files) + " files";
  std::string words = again.same() ? "from " + from + ": every digit is the same" : "from " + from + ": it comes out otherwise";
  if (again.recorded_by != again.program) words += "; recorded by " + shown(again.recorded_by, 60) + ", measured again by " + again.program;
  page += wrapped(in_script(words, style.script), kIndent, style.width);
  if (again.same()) return page;
  Rows rows{{"", "recorded", "now"}};
  for (const auto& each : again.differences) rows.push_back({shown(each.where, 100), each.recorded, each.now});
  add_rows(std::move(rows), style, page);
  if (again.more > 0) page += std::string(kIndent) + "and " + std::to_string(again.more) + " more\n";
  return page;
}

std::string verify_text(const LedgerCheck& check, const std::string& file, const std::optional<ExpectedHead>& expected,
                        const TextStyle& style) {
  std::string page = shown(file) + ": ";
  if (check.holds()) {
    page += check.entries == 0 ? "no entry yet, and the ledger is as it was made"
                               : "the chain of " + std::to_string(check.entries) + (check.entries == 1 ? " entry" : " entries") + " holds";
  } else {
    page += "the chain does not hold";
  }
  page = in_script(page, style.script) + "\n";
  for (const LedgerFault& fault : check.faults) {
    page += wrapped(in_script(fault.what, style.script),
                    std::string(kIndent) + (fault.id > 0 ? "entry " + std::to_string(fault.id) : std::string("file")) + "  ", style.width);
  }
  if (check.more_faults) page += std::string(kIndent) + "and more\n";
  if (expected && expected->id) {
    page += "the head that was stated is that of entry " + std::to_string(*expected->id) + "\n";
  } else if (expected && check.holds()) {
    page += wrapped(fault_in_words(check, expected), "", style.width);
  }
  page += "head: entry " + std::to_string(check.head.id) + ", " + check.head.hash + "\n";
  return page;
}

}  // namespace coilassay

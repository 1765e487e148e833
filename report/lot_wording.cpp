#include "report/lot_wording.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "base/outside_text.h"
#include "report/wording.h"

namespace coilassay {

std::string_view decision_in_words(LotResult decision) {
  switch (decision) {
    case LotResult::accept: return "Accepted";
    case LotResult::reject: return "Rejected";
    case LotResult::undecided: return "Undecided";
  }
  return "";
}

std::string_view verdict_in_words(Verdict verdict) {
  switch (verdict) {
    case Verdict::pass: return "passes";
    case Verdict::fail: return "fails";
    case Verdict::undecided: return "undecided";
    case Verdict::not_comparable: return "not comparable";
  }
  return "";
}

std::string lot_in_words(const LotRecord& lot) {
  const bool says_so = lot.lot.starts_with("lot") || lot.lot.starts_with("Lot");
  std::string words = (says_so ? "" : "lot ") + shown(lot.lot, 80) + " of " + shown(lot.sheet.name, 80);
  if (!lot.sheet.revision.empty()) words += ", revision " + shown(lot.sheet.revision, 40);
  if (!lot.sheet.supplier.empty()) words += ", from " + shown(lot.sheet.supplier, 80);
  return words;
}

std::string value_in_words(const LimitVerdict& limit, Script script) {
  if (!limit.value) return "no value";
  if (!limit.U || !(*limit.U > 0)) return to_text(*limit.value, limit.unit, script);
  return to_text_expanded(*limit.value, *limit.U, limit.unit, script);
}

std::string limits_in_words(const LimitVerdict& limit, Script script) {
  const auto words = [&](double value) { return setting_in_words(value, limit.unit, script); };
  if (limit.min && limit.max) return words(*limit.min) + " to " + words(*limit.max);
  if (limit.min) return "at least " + words(*limit.min);
  return limit.max ? "at most " + words(*limit.max) : "";
}

std::string probability_in_words(const LimitVerdict& limit) {
  if (!limit.p_conform) return "";
  const double p = *limit.p_conform;
  if (p < 0.001) return "under 0.1 %";
  if (p > 0.999) return "over 99.9 %";
  return fmt::format("{:.1f} %", 100 * p);
}

std::vector<const LotUnitRecord*> not_passing(const LotRecord& lot) {
  const auto weight = [](Verdict verdict) {
    switch (verdict) {
      case Verdict::fail: return 0;
      case Verdict::not_comparable: return 2;
      case Verdict::undecided: return 1;
      case Verdict::pass: break;
    }
    return 3;
  };
  std::vector<const LotUnitRecord*> units;
  for (const LotUnitRecord& each : lot.units) {
    if (each.verdict.verdict != Verdict::pass) units.push_back(&each);
  }
  std::stable_sort(units.begin(), units.end(), [&](const LotUnitRecord* a, const LotUnitRecord* b) {
    return weight(a->verdict.verdict) < weight(b->verdict.verdict);
  });
  return units;
}

std::string values_in_words(const LotValues& values, Script script) {
  const auto words = [&](double value, int digits) { return to_text(value, values.unit, script, digits); };
  std::string text = values.U_mean ? to_text_expanded(values.mean, *values.U_mean, values.unit, script) + " on average"
                                   : words(values.mean, 5);
  if (values.n > 1) text += ", from " + words(values.least, 5) + " to " + words(values.most, 5);
  if (values.spread) {
    text += "; the parts spread by " + (*values.spread > 0 ? words(*values.spread, 2) : "less than their own errors");
  }
  text += "; standard uncertainty ";
  if (values.u_own > 0) text += words(values.u_own, 2) + " of each unit for itself, ";
  text += words(values.u_common, 2) + " common to all";
  return text;
}

std::string capability_in_words(const LotValues& values) {
  if (!values.capability) return "";
  std::string text;
  const auto add = [&text](const char* symbol, const std::optional<Index>& index) {
    if (!index) return;
    text += fmt::format("{}{} {:.2f} ({:.2f} to {:.2f})", text.empty() ? "" : ", ", symbol, index->value, index->low, index->high);
  };
  add("Cp", values.capability->cp);
  add("Cpk", values.capability->cpk);
  add("Pp", values.capability->pp);
  add("Ppk", values.capability->ppk);
  if (!values.signals.empty()) {
    text += fmt::format("; the values are not those of a steady process ({} at value {}{}), so these say little about the next lot",
                        name(values.signals.front().rule), values.signals.front().at + 1,
                        values.signals.size() > 1 ? fmt::format(", and {} more", values.signals.size() - 1) : "");
  }
  return text;
}

std::string protection_in_words(const LotRecord& lot) {
  if (!lot.plan || lot.plan->scheme == SamplingScheme::all || lot.plan->whole_lot) return "";
  return passes_in_words(*lot.plan, 0.05);
}

std::vector<Finding> findings_to_tell(const LotRecord& lot) {
  std::vector<Finding> findings = lot.findings;
  struct OfAKind {
    Finding first;
    std::string serial;
    std::size_t others = 0;
  };
  std::vector<OfAKind> kinds;
  for (const LotUnitRecord& unit : lot.units) {
    for (const Finding& each : unit.verdict.findings) {
      if (each.code == "not_comparable") continue;  // told with the unit
      const auto known = std::find_if(kinds.begin(), kinds.end(), [&](const OfAKind& kind) {
        return kind.first.code == each.code && kind.first.about == each.about && kind.first.severity == each.severity;
      });
      if (known == kinds.end()) kinds.push_back({each, unit.verdict.serial, 0});
      else if (known->serial != unit.verdict.serial) ++known->others;
    }
  }
  for (OfAKind& kind : kinds) {
    std::string whose = "unit " + shown(kind.serial, 60);
    if (kind.others > 0) whose += fmt::format(" and {} more", kind.others);
    kind.first.message = whose + ": " + kind.first.message;
    findings.push_back(std::move(kind.first));
  }
  return by_weight(std::move(findings));
}

std::string record_in_words(const LotRecord& lot) {
  if (!lot.ledger) return "Nothing was recorded: a ledger keeps verdicts, with --ledger FILE.";
  const LotLedger& place = *lot.ledger;
  if (place.last == 0) {
    return fmt::format("Nothing was added to the ledger {}, whose last hash is {}.", shown(place.file), place.head);
  }
  std::string text = fmt::format("Recorded in {} as entries {} to {}; the ledger's last hash is {}.", shown(place.file),
                                 place.first, place.last, place.head);
  if (place.replaces) text += fmt::format(" The decision replaces that of entry {}.", *place.replaces);
  return text;
}

}  // namespace coilassay

#include "report/lot_json.h"

#include <cmath>
#include <nlohmann/json.hpp>

#include "report/json_writer.h"
#include "report/result_json.h"
#include "report/verdict_json.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

Json number(double value) { return std::isfinite(value) ? Json(value) : Json(nullptr); }
template <class T>
Json if_known(const std::optional<T>& value) {
  return value ? Json(*value) : Json(nullptr);
}
Json if_said(const std::string& outside) { return outside.empty() ? Json(nullptr) : Json(json_safe(outside)); }

Json limits(const UnitVerdict& unit) {
  Json list = Json::array();
  for (const LimitVerdict& each : unit.limits) list.push_back(limit_document(each));
  return list;
}

Json plan(const LotRecord& lot) {
  if (!lot.plan) return nullptr;
  const SamplingPlan& p = *lot.plan;
  Json document = {{"scheme", name(p.scheme)}};
  document["code_letter"] = if_said(p.code_letter);
  document["plan_letter"] = if_said(p.plan_letter);
  document["aql"] = p.aql_percent > 0 ? Json(p.aql_percent) : Json(nullptr);
  document["n"] = p.n;
  document["accept"] = p.accept;
  document["reject"] = p.reject;
  document["k"] = if_known(p.k);
  document["severity"] = name(p.severity);
  document["draw_seed"] = p.draw_seed;
  document["why"] = json_safe(p.why);
  return document;
}

Json unit(const LotUnitRecord& record) {
  const UnitVerdict& v = record.verdict;
  Json files = Json::array();
  for (const LotFile& each : record.files) {
    files.push_back({{"test", json_safe(each.test)}, {"file", json_safe(each.file)}, {"sha256", if_said(each.sha256)}});
  }
  Json document = {{"serial", json_safe(v.serial)}, {"attempt", v.attempt}, {"verdict", name(v.verdict)}};
  document["limits"] = limits(v);
  document["attempts_made"] = record.made;
  document["attempts_counted"] = record.counted;
  document["in_sample"] = record.in_sample;
  document["from_ledger"] = record.from_ledger;
  document["entry"] = if_known(record.entry);
  document["files"] = std::move(files);
  document["findings"] = findings_document(v.findings);
  return document;
}

Json index_document(const std::optional<Index>& index) {
  if (!index) return nullptr;
  return Json{{"value", number(index->value)}, {"interval", {number(index->low), number(index->high)}}};
}

Json capability(const LotValues& values) {
  if (!values.capability) return nullptr;
  const Capability& c = *values.capability;
  return Json{{"Cp", index_document(c.cp)},
              {"Cpk", index_document(c.cpk)},
              {"Pp", index_document(c.pp)},
              {"Ppk", index_document(c.ppk)},
              {"deviation_within", number(c.deviation_within)},
              {"deviation_overall", number(c.deviation_overall)}};
}

Json signals(const LotValues& values) {
  Json list = Json::array();
  for (const RunSignal& each : values.signals) list.push_back({{"rule", name(each.rule)}, {"at", each.at + 1}});
  return list;
}

Json statistics(const LotRecord& lot) {
  Json list = Json::array();
  for (const LotValues& each : lot.statistics) {
    list.push_back({{"quantity", each.quantity},
                    {"unit", symbol(each.unit)},
                    {"n", each.n},
                    {"mean", number(each.mean)},
                    {"U_mean", if_known(each.U_mean)},
                    {"least", number(each.least)},
                    {"most", number(each.most)},
                    {"deviation", if_known(each.deviation)},
                    {"spread", if_known(each.spread)},
                    {"u_own", number(each.u_own)},
                    {"u_common", number(each.u_common)},
                    {"capability", capability(each)},
                    {"signals", signals(each)}});
  }
  return list;
}

Json tests(const LotRecord& lot) {
  Json list = Json::array();
  for (const LotTestRecord& each : lot.tests) {
    Json item = {{"test", json_safe(each.test)}, {"kind", each.kind}};
    item["bench"] =
        each.bench ? Json{{"file", json_safe(*each.bench)}, {"sha256", each.bench_sha256}} : Json(nullptr);
    item["equipment"] = equipment_document(each.equipment);
    list.push_back(std::move(item));
  }
  return list;
}

Json check_standard(const LotRecord& lot) {
  if (!lot.check || !lot.check_chart || !lot.sheet.check_standard) return nullptr;
  const CheckChart& chart = *lot.check_chart;
  Json document = {{"serial", json_safe(lot.sheet.check_standard->serial)},
                   {"quantity", lot.sheet.check_standard->quantity},
                   {"state", name(lot.check->state)},
                   {"readings", chart.readings.size()}};
  document["last_value"] = chart.readings.empty() ? Json(nullptr) : number(chart.readings.back().value);
  document["low"] = chart.established ? number(chart.low) : Json(nullptr);
  document["high"] = chart.established ? number(chart.high) : Json(nullptr);
  document["last_good"] = lot.check->last_good ? Json(to_text(*lot.check->last_good)) : Json(nullptr);
  document["why"] = json_safe(lot.check->why);
  return document;
}

Json cautions(const LotRecord& lot) {
  Json list = Json::array();
  for (const Caution& each : lot.cautions) {
    list.push_back({{"code", each.code},
                    {"severity", name(each.severity)},
                    {"message", json_safe(each.message)},
                    {"figure", number(each.figure)},
                    {"unit", symbol(each.unit)},
                    {"basis", json_safe(each.basis)}});
  }
  return list;
}

Json ledger(const LotRecord& lot) {
  if (!lot.ledger) return nullptr;
  const LotLedger& place = *lot.ledger;
  Json document = {{"file", json_safe(place.file)}, {"first", place.first}, {"last", place.last}, {"head", place.head}};
  document["entry"] = if_known(place.entry);
  document["replaces"] = if_known(place.replaces);
  return document;
}

Json document_of(const LotRecord& lot) {
  const LotCounts& counts = lot.decision.counts;
  Json document = {{"schema", "coilassay.lot/1"}, {"program", lot.program}, {"time", to_text(lot.when)}};
  document["operator"] = if_said(lot.operator_name);
  document["part"] = json_safe(lot.sheet.name);
  document["revision"] = if_said(lot.sheet.revision);
  document["supplier"] = if_said(lot.sheet.supplier);
  document["sheet"] = json_safe(lot.sheet.path);
  document["sheet_sha256"] = lot.sheet.sha256;
  document["lot"] = json_safe(lot.lot);
  document["lot_size"] = lot.lot_size;
  document["rule"] = name(lot.sheet.decision.rule);
  document["risk"] = lot.sheet.decision.risk;
  document["plan"] = plan(lot);
  Json units = Json::array();
  for (const LotUnitRecord& each : lot.units) units.push_back(unit(each));
  document["units"] = std::move(units);
  document["inspected"] = counts.inspected;
  document["nonconforming"] = counts.nonconforming;
  document["undecided"] = counts.undecided;
  document["not_comparable"] = counts.not_comparable;
  document["decision"] = name(lot.decision.decision);
  document["why"] = json_safe(lot.decision.why);
  const Json next = lot.next ? Json(name(lot.next->severity)) : Json(nullptr);
  document["next_severity"] = next;
  document["statistics"] = statistics(lot);
  document["tests"] = tests(lot);
  document["check_standard"] = check_standard(lot);
  document["findings"] = findings_document(lot.findings);
  document["cautions"] = cautions(lot);
  document["ledger"] = ledger(lot);
  return document;
}

}  // namespace

std::string to_json(const LotRecord& lot) { return json_text(document_of(lot)); }

std::string to_json_line(const LotRecord& lot) { return document_of(lot).dump() + '\n'; }

std::string unit_line(const UnitVerdict& attempt, const UnitVerdict& standing, std::optional<std::int64_t> entry,
                      bool from_ledger) {
  Json document = {{"schema", "coilassay.unit/1"},
                   {"serial", json_safe(attempt.serial)},
                   {"attempt", attempt.attempt},
                   {"verdict", name(attempt.verdict)},
                   {"standing", name(standing.verdict)},
                   {"limits", limits(attempt)},
                   {"findings", findings_document(attempt.findings)}};
  document["entry"] = if_known(entry);
  document["from_ledger"] = from_ledger;
  return document.dump() + '\n';
}

std::string to_json(const SheetCheck& check) {
  Json problems = Json::array();
  for (const SheetProblem& each : check.problems) {
    problems.push_back({{"place", json_safe(each.place)},
                        {"contradiction", each.contradiction},
                        {"finding", json_safe(each.finding)},
                        {"remedy", json_safe(each.remedy)}});
  }
  Json sentences = Json::array();
  for (const std::string& each : check.sentences) sentences.push_back(json_safe(each));
  Json document = {{"schema", "coilassay.sheet-check/1"}, {"sheet", json_safe(check.path)}, {"sha256", check.sha256}};
  document["part"] = json_safe(check.part);
  document["revision"] = if_said(check.revision);
  document["usable"] = check.usable();
  document["sentences"] = std::move(sentences);
  document["problems"] = std::move(problems);
  return json_text(document);
}

}  // namespace coilassay

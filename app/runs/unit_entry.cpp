#include "app/runs/unit_entry.h"

#include <nlohmann/json.hpp>

#include "report/json_writer.h"
#include "report/result_json.h"
#include "report/verdict_json.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

tl::unexpected<Error> broken(const EntryContent& entry) {
  return failure(Problem::ledger, "entry of " + std::string(name(entry.kind)),
                 "the details of an entry are not as this program writes them",
                 "coilassay ledger verify says what is wrong");
}

EntryContent common(EntryKind kind, const InspectionSetting& setting) {
  EntryContent entry;
  entry.kind = kind;
  entry.time = setting.now;
  entry.part = json_safe(setting.sheet->name);
  entry.revision = json_safe(setting.sheet->revision);
  entry.supplier = json_safe(setting.sheet->supplier);
  entry.sheet_sha256 = setting.sheet->sha256;
  entry.lot = json_safe(setting.lot);
  entry.operator_name = json_safe(setting.operator_name);
  entry.instrument = json_safe(setting.instrument);
  entry.program = setting.program;
  return entry;
}

std::vector<EntrySource> sources_of(const std::vector<TestRun>& tests) {
  std::vector<EntrySource> sources;
  for (const TestRun& run : tests) {
    for (const SourceRecord& record : run.measurement.sources) {
      // A file that could not be read to its end has no digest; the findings tell of it.
      if (record.source.sha256.size() != 64) continue;
      sources.push_back({json_safe(run.test), json_safe(record.source.name), record.source.sha256});
    }
  }
  return sources;
}

Json tests_document(const std::vector<TestRun>& tests, const std::string& program) {
  Json list = Json::array();
  for (const TestRun& run : tests) {
    Measurement bare = run.measurement;
    bare.tables.clear();
    Json item = {{"test", json_safe(run.test)}, {"kind", run.kind}};
    item["bench"] = run.bench ? Json{{"file", json_safe(*run.bench)}, {"sha256", run.bench_sha256}} : Json(nullptr);
    item["result"] = result_document(bare, program);
    list.push_back(std::move(item));
  }
  return list;
}

Json details_of(const EntryContent& entry) {
  Json details = Json::parse(entry.details, nullptr, false);
  return details.is_object() ? details : Json::object();
}

}  // namespace

EntryContent unit_entry(const UnitRun& unit, const InspectionSetting& setting) {
  EntryContent entry = common(EntryKind::unit, setting);
  entry.serial = json_safe(unit.verdict.serial);
  entry.attempt = static_cast<int>(unit.verdict.attempt);
  entry.verdict = name(unit.verdict.verdict);
  entry.sources = sources_of(unit.tests);
  entry.reason = json_safe(unit.reason);
  Json limits = Json::array();
  for (const LimitVerdict& limit : unit.verdict.limits) limits.push_back(limit_document(limit));
  entry.details = Json{{"limits", std::move(limits)},
                       {"findings", findings_document(unit.verdict.findings)},
                       {"sheet", json_safe(setting.sheet->path)},
                       {"tests", tests_document(unit.tests, setting.program)}}
                      .dump();
  return entry;
}

Result<UnitVerdict> verdict_of_entry(const EntryContent& entry, const PartSheet& sheet) {
  const Json details = details_of(entry);
  const auto limits = details.find("limits"), findings = details.find("findings");
  if (entry.kind != EntryKind::unit || entry.sheet_sha256 != sheet.sha256 || entry.attempt < 1 ||
      limits == details.end() || !limits->is_array() || limits->size() != sheet.limits.size() ||
      findings == details.end()) {
    return broken(entry);
  }
  UnitVerdict unit;
  unit.serial = entry.serial;
  unit.attempt = static_cast<std::uint64_t>(entry.attempt);
  for (std::size_t i = 0; i < sheet.limits.size(); ++i) {
    Result<LimitVerdict> limit = limit_of_document((*limits)[i], sheet.limits[i]);
    if (!limit) return failure(limit);
    unit.limits.push_back(std::move(*limit));
  }
  Result<std::vector<Finding>> seen = findings_of_document(*findings);
  if (!seen) return failure(seen);
  unit.findings = std::move(*seen);
  for (const Verdict each : {Verdict::pass, Verdict::fail, Verdict::undecided, Verdict::not_comparable}) {
    if (name(each) == entry.verdict) {
      unit.verdict = each;
      return unit;
    }
  }
  return broken(entry);
}

Result<std::vector<Caution>> cautions_of_entry(const EntryContent& entry) {
  std::vector<Caution> all;
  const Json details = details_of(entry);
  const auto tests = details.find("tests");
  if (tests == details.end() || !tests->is_array()) return broken(entry);
  for (const Json& test : *tests) {
    if (!test.is_object() || !test.contains("result") || !test["result"].is_object()) return broken(entry);
    const auto list = test["result"].find("cautions");
    if (list == test["result"].end()) continue;
    Result<std::vector<Caution>> cautions = cautions_of_document(*list);
    if (!cautions) return failure(cautions);
    all.insert(all.end(), cautions->begin(), cautions->end());
  }
  return all;
}

EntryContent check_entry(const Estimate& value, const std::vector<TestRun>& tests, const InspectionSetting& setting) {
  EntryContent entry = common(EntryKind::check, setting);
  entry.serial = json_safe(setting.sheet->check_standard ? setting.sheet->check_standard->serial : "");
  entry.sources = sources_of(tests);
  entry.details = Json{{"quantity", value.symbol},
                       {"unit", symbol(value.quantity.unit)},
                       {"value", value.quantity.value},
                       {"u", value.quantity.standard_uncertainty},
                       {"tests", tests_document(tests, setting.program)}}
                      .dump();
  return entry;
}

Result<CheckReading> check_reading_of(const EntryContent& entry) {
  const Json details = details_of(entry);
  const auto value = details.find("value");
  if (entry.kind != EntryKind::check || value == details.end() || !value->is_number()) return broken(entry);
  return CheckReading{entry.time, value->get<double>()};
}

EntryContent lot_entry(const LotOutcome& lot, const InspectionSetting& setting) {
  EntryContent entry = common(EntryKind::lot, setting);
  entry.verdict = name(lot.decision.decision);
  const LotCounts& counts = lot.decision.counts;
  const std::string_view now = name(lot.plan.severity), next = name(lot.next.severity);
  entry.details = Json{{"lot_size", lot.lot_size},
                       {"plan",
                        {{"scheme", name(lot.plan.scheme)},
                         {"severity", now},
                         {"n", lot.plan.n},
                         {"accept", lot.plan.accept},
                         {"reject", lot.plan.reject},
                         {"k", lot.plan.k ? Json(*lot.plan.k) : Json(nullptr)},
                         {"draw_seed", lot.plan.draw_seed},
                         {"why", lot.plan.why}}},
                       {"inspected", counts.inspected},
                       {"nonconforming", counts.nonconforming},
                       {"undecided", counts.undecided},
                       {"not_comparable", counts.not_comparable},
                       {"between_accept_and_reject", lot.decision.between_accept_and_reject},
                       {"why", json_safe(lot.decision.why)},
                       {"next_severity", next},
                       {"units", lot.units}}
                      .dump();
  return entry;
}

Result<LotHistory> lot_history_of(const EntryContent& entry) {
  const Json details = details_of(entry);
  const auto plan = details.find("plan");
  if (entry.kind != EntryKind::lot || plan == details.end() || !plan->is_object()) return broken(entry);
  LotHistory history;
  history.time = entry.time;
  const auto between = details.find("between_accept_and_reject"), word = plan->find("severity");
  if (word == plan->end() || !word->is_string()) return broken(entry);
  history.between_accept_and_reject = between != details.end() && between->is_boolean() && between->get<bool>();
  const std::string severity = word->get<std::string>();
  for (const Severity105 each :
       {Severity105::normal, Severity105::tightened, Severity105::reduced, Severity105::discontinued}) {
    if (name(each) == severity) history.severity = each;
  }
  for (const LotResult each : {LotResult::accept, LotResult::reject, LotResult::undecided}) {
    if (name(each) == entry.verdict) {
      history.decision = each;
      return history;
    }
  }
  return broken(entry);
}

std::vector<std::int64_t> units_of(const EntryContent& entry) {
  std::vector<std::int64_t> ids;
  const Json details = details_of(entry);
  const auto list = details.find("units");
  if (list == details.end() || !list->is_array()) return ids;
  for (const Json& id : *list) {
    if (id.is_number_integer()) ids.push_back(id.get<std::int64_t>());
  }
  return ids;
}

}  // namespace coilassay

#include "report/gauge_json.h"

#include <cmath>
#include <nlohmann/json.hpp>

#include "report/json_writer.h"
#include "report/result_json.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

Json number(double value) { return std::isfinite(value) ? Json(value) : Json(nullptr); }

Json line_of(const char* source, const VarianceLine& line) {
  return {{"source", source},
          {"dof", line.dof},
          {"sum_of_squares", number(line.sum_of_squares)},
          {"mean_square", number(line.mean_square)},
          {"f", number(line.f)},
          {"p", number(line.p)}};
}

Json with_interval(const WithInterval& value) {
  return {{"value", number(value.value)}, {"interval", {number(value.low), number(value.high)}}};
}

Json names_of(const std::vector<std::string>& names) {
  Json list = Json::array();
  for (const std::string& name : names) list.push_back(json_safe(name));
  return list;
}

}  // namespace

std::string to_json(const GaugeRecord& record, std::string_view program) {
  const GaugeStudy& study = record.study;
  Json document = {{"schema", "coilassay.gauge/1"},
                   {"program", program},
                   {"quantity", record.quantity.empty() ? Json(nullptr) : Json(record.quantity)},
                   {"unit", symbol(record.unit)},
                   {"conditions", record.conditions.empty() ? Json(nullptr) : Json(record.conditions)},
                   {"parts", names_of(study.parts)},
                   {"operators", names_of(study.operators)},
                   {"trials", names_of(study.trials)}};
  Json& table = document["analysis"] = Json::array();
  table.push_back(line_of("part", study.table.first));
  table.push_back(line_of("operator", study.table.second));
  table.push_back(line_of("interaction", study.table.interaction));
  table.push_back(line_of("within", study.table.within));
  if (study.pooled_within) table.push_back(line_of("pooled", *study.pooled_within));
  document["interaction_pooled"] = study.pooled;
  document["components"] = Json::array();
  for (const GaugeComponent& c : study.components) {
    document["components"].push_back(
        {{"name", c.name}, {"sigma", number(c.sigma)}, {"interval", {number(c.low), number(c.high)}}, {"share", number(c.share)}});
  }
  document["grr_of_study"] = with_interval(study.grr_of_study);
  document["tolerance"] = record.tolerance ? Json(*record.tolerance) : Json(nullptr);
  document["grr_of_tolerance"] = study.grr_of_tolerance ? with_interval(*study.grr_of_tolerance) : Json(nullptr);
  document["categories"] = with_interval(study.categories);
  document["ndc"] = study.ndc;
  document["confidence"] = 0.95;
  document["judgement"] = study.judgement;
  document["why"] = study.why;
  const std::string lines = gauge_sheet_lines(record);
  document["sheet_lines"] = lines.empty() ? Json(nullptr) : Json(lines);
  document["readings"] = Json::array();
  for (const GaugeReading& r : record.readings) {
    document["readings"].push_back({{"part", json_safe(r.part)}, {"operator", json_safe(r.operator_name)}, {"trial", json_safe(r.trial)}, {"value", number(r.value)}});
  }
  document["sources"] = Json::array();
  for (const GaugeRecord::File& file : record.files) {
    document["sources"].push_back({{"file", json_safe(file.file)}, {"sha256", file.sha256}});
  }
  document["findings"] = findings_document(record.findings);
  return json_text(document);
}

}  // namespace coilassay

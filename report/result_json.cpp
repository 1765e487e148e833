#include "report/result_json.h"

#include <cassert>
#include <cmath>
#include <nlohmann/json.hpp>

#include "report/json_writer.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

Json number(double value) {
  return std::isfinite(value) ? Json(value) : Json(nullptr);
}
Json number(const std::optional<double>& value) {
  return value ? number(*value) : Json(nullptr);
}

void add_number(Json& to, const char* key, const std::optional<double>& value) {
  if (value && std::isfinite(*value)) to[key] = *value;
}
void add_text(Json& to, const char* key, const std::string& outside) {
  if (!outside.empty()) to[key] = json_safe(outside);
}

Json sources(const std::vector<SourceRecord>& records) {
  Json list = Json::array();
  for (const SourceRecord& record : records) {
    Json item = {{"file", json_safe(record.source.name)},
                 {"sha256", record.source.sha256},
                 {"samples", record.samples},
                 {"sample_interval_s", number(record.sample_interval_s)}};
    add_text(item, "identity", record.source.identity);
    list.push_back(std::move(item));
  }
  return list;
}

Json conditions(const Conditions& c) {
  return {{"frequency_Hz", number(c.frequency_hz)},
          {"level_V", number(c.level_v)},
          {"level_A", number(c.level_a)},
          {"bias_A", number(c.bias_a)},
          {"peak_current_A", number(c.peak_current_a)},
          {"temperature_degC", number(c.temperature_degc)}};
}

Json equipment(const std::vector<EquipmentItem>& items) {
  Json list = Json::array();
  for (const EquipmentItem& each : items) {
    Json item = {{"id", json_safe(each.id)}};
    add_text(item, "calibrated", each.calibrated);
    add_text(item, "due", each.due);
    add_text(item, "certificate", each.certificate);
    list.push_back(std::move(item));
  }
  return list;
}

Json corrections(const std::vector<Correction>& made) {
  Json list = Json::array();
  for (const Correction& each : made) {
    list.push_back({{"name", json_safe(each.name)}, {"value", number(each.value)}, {"unit", symbol(each.unit)}});
  }
  return list;
}

Json estimate(const Estimate& e) {
  const double half_width = std::isfinite(e.low) && std::isfinite(e.high) ? e.half_width() : std::nan("");
  const double k = std::isfinite(e.k) ? e.k : half_width / e.quantity.standard_uncertainty;
  Json item = {{"value", e.quantity.value},
               {"unit", symbol(e.quantity.unit)},
               {"u", number(e.quantity.standard_uncertainty)},
               {"k", number(k)},
               {"U", number(half_width)},
               {"interval", {number(e.low), number(e.high)}},
               {"confidence", e.confidence},
               {"dof", number(e.dof)}};
  add_number(item, "at_Hz", e.at_hz);
  add_number(item, "at_A", e.at_a);
  add_number(item, "reference_A", e.reference_a);
  add_text(item, "definition", e.definition);
  return item;
}

/// The first estimate of a symbol stands, as with Measurement::find(); one that is no number was not established.
void add_estimates(Json& to, const std::vector<Estimate>& estimates) {
  for (const Estimate& each : estimates) {
    if (std::isfinite(each.quantity.value) && !to.contains(each.symbol)) to[each.symbol] = estimate(each);
  }
}

Json bounds(const std::vector<Bound>& all) {
  Json object = Json::object();
  for (const Bound& each : all) {
    Json item = Json::object();
    add_number(item, "at_least", each.at_least);
    add_number(item, "at_most", each.at_most);
    item["unit"] = symbol(each.unit);
    item["confidence"] = each.confidence;
    object[each.symbol] = std::move(item);
  }
  return object;
}

Json correlations(const std::vector<Measurement::Correlation>& all) {
  Json list = Json::array();
  for (const auto& each : all) {
    if (std::isfinite(each.value)) list.push_back({each.a, each.b, each.value});
  }
  return list;
}

Json budget(const Measurement& m) {
  Json object = Json::object();
  for (const auto& [of, lines] : m.budget) {
    Json list = Json::array();
    for (const BudgetLine& line : lines) {
      Json item = {{"source", json_safe(line.source)},
                   {"kind", std::string(1, line.kind)},
                   {"u", number(line.u)},
                   {"share", number(line.share)},
                   {"common", line.common}};
      add_text(item, "basis", line.basis);
      list.push_back(std::move(item));
    }
    object[of] = std::move(list);
  }
  return object;
}

Json findings(const std::vector<Finding>& all) {
  Json list = Json::array();
  for (const Finding& each : all) {
    Json item = {{"code", each.code},
                 {"severity", name(each.severity)},
                 {"message", json_safe(each.message)},
                 {"figure", number(each.figure)}};
    if (each.unit != Unit::one) item["unit"] = symbol(each.unit);
    add_text(item, "about", each.about);
    list.push_back(std::move(item));
  }
  return list;
}

Json cautions(const std::vector<Caution>& all) {
  Json list = Json::array();
  for (const Caution& each : all) {
    list.push_back({{"code", each.code},
                    {"severity", name(each.severity)},
                    {"message", json_safe(each.message)},
                    {"figure", number(each.figure)},
                    {"unit", symbol(each.unit)},
                    {"basis", json_safe(each.basis)}});
  }
  return list;
}

Json model(const ModelSummary& m) {
  Json parameters = Json::object();
  for (const auto& [key, quantity] : m.parameters) {
    parameters[key] = {{"value", number(quantity.value)},
                       {"u", number(quantity.standard_uncertainty)},
                       {"unit", symbol(quantity.unit)}};
  }
  Json left_out = Json::array();
  for (const std::string& each : m.left_out) left_out.push_back(json_safe(each));
  return {
      {"name", m.name},
      {"parameters", std::move(parameters)},
      {"runner_up", m.runner_up ? Json(*m.runner_up) : Json(nullptr)},
      {"left_out", std::move(left_out)},
      {"window_s", m.window_s ? Json::array({number(m.window_s->first), number(m.window_s->second)}) : Json(nullptr)},
      {"residual_rms", number(m.residual_rms)},
      {"reduced_chi_square", number(m.reduced_chi_square)},
      {"converged", m.converged}};
}

Json columns(const Table& table) {
  Json object = Json::object();
  for (const TableColumn& column : table.columns) {
    Json values = Json::array();
    for (double value : column.values) values.push_back(number(value));
    object[column.name] = std::move(values);
  }
  return object;
}

/// A table as a list of rows; a place without a number has no key.
Json rows(const Table& table) {
  Json list = Json::array();
  const std::size_t count = table.columns.empty() ? 0 : table.columns.front().values.size();
  for (std::size_t row = 0; row < count; ++row) {
    Json item = Json::object();
    for (const TableColumn& column : table.columns) {
      assert(column.values.size() == count);
      add_number(item, column.name.c_str(), column.values[row]);
    }
    list.push_back(std::move(item));
  }
  return list;
}

Json points(const std::vector<Point>& all) {
  Json list = Json::array();
  for (const Point& each : all) {
    Json item = Json::object();
    if (each.index) item["index"] = *each.index;
    add_number(item, "at_Hz", each.at_hz);
    add_number(item, "level_A", each.level_a);
    add_number(item, "bias_A", each.bias_a);
    add_number(item, "capacitance_F", each.capacitance_f);
    add_estimates(item, each.estimates);
    add_text(item, "from", each.from);
    list.push_back(std::move(item));
  }
  return list;
}

Json inputs(const std::vector<InputCheck>& all) {
  Json list = Json::array();
  for (const InputCheck& each : all) {
    Json item = {{"item", each.item},
                 {"value", number(each.value.value)},
                 {"u", number(each.value.standard_uncertainty)},
                 {"unit", symbol(each.value.unit)},
                 {"predicted", number(each.predicted)},
                 {"residual_u", number(each.residual_u)}};
    add_number(item, "at_Hz", each.at_hz);
    list.push_back(std::move(item));
  }
  return list;
}

Json equivalents(const std::vector<Equivalent>& all) {
  Json object = Json::object();
  for (const Equivalent& each : all) {
    Json item = Json::object();
    add_estimates(item, each.elements);
    Json between = Json::array();
    for (std::size_t a = 0; a < each.correlation.size(); ++a) {
      for (std::size_t b = a + 1; b < each.elements.size(); ++b) {
        between.push_back({each.elements[a].symbol, each.elements[b].symbol, number(each.correlation[a][b])});
      }
    }
    item["correlations"] = std::move(between);
    object[each.name] = std::move(item);
  }
  return object;
}

Json matrix(const std::vector<std::vector<double>>& rows_of) {
  Json all = Json::array();
  for (const std::vector<double>& row : rows_of) {
    Json line = Json::array();
    for (const double value : row) line.push_back(number(value));
    all.push_back(std::move(line));
  }
  return all;
}

Json matrices(const InductanceMatrices& m) {
  return {{"ports", m.ports},
          {"inductance_H", matrix(m.inductance_h)},
          {"U_H", matrix(m.U_h)},
          {"coupling", matrix(m.coupling)},
          {"positive_definite", m.positive_definite}};
}

}  // namespace

Json findings_document(const std::vector<Finding>& all) { return findings(all); }

Json equipment_document(const std::vector<EquipmentItem>& items) { return equipment(items); }

std::string to_json(const Measurement& m, std::string_view program) { return json_text(result_document(m, program)); }

Json result_document(const Measurement& m, std::string_view program) {
  Json document = {{"schema", "coilassay.result/1"}, {"program", program}, {"test", m.test}};
  document["sources"] = sources(m.sources);
  document["conditions"] = conditions(m.conditions);
  document["equipment"] = equipment(m.equipment);
  document["corrections"] = corrections(m.corrections);
  document["quantities"] = Json::object();
  add_estimates(document["quantities"], m.estimates);
  document["bounds"] = bounds(m.bounds);
  document["correlations"] = correlations(m.correlations);
  document["budget"] = budget(m);
  document["findings"] = findings(m.findings);
  document["cautions"] = cautions(m.cautions);
  if (m.model) document["model"] = model(*m.model);
  if (!m.points.empty()) document["points"] = points(m.points);
  if (!m.pulses.empty()) document["pulses"] = points(m.pulses);
  if (!m.inputs.empty()) document["inputs"] = inputs(m.inputs);
  if (!m.equivalents.empty()) document["equivalents"] = equivalents(m.equivalents);
  if (m.matrices) document["matrices"] = matrices(*m.matrices);
  for (const Table& table : m.tables) {
    // Tables for figures: the samples are in the file that was read, what a line goes through stands in the points.
    if (table.name.starts_with("trace") || table.name == "line") continue;
    assert(!document.contains(table.name) || table.name == "points");
    if (table.name != "points") {
      document[table.name] = columns(table);
    } else if (m.points.empty()) {
      document["points"] = rows(table);
    }
  }
  return document;
}

std::string to_json(const Error& error) {
  return json_text({{"schema", "coilassay.error/1"},
                    {"problem", name(error.problem)},
                    {"place", json_safe(error.place)},
                    {"finding", json_safe(error.finding)},
                    {"remedy", json_safe(error.remedy)}});
}

}  // namespace coilassay

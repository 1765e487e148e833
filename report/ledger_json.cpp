#include "report/ledger_json.h"

#include <nlohmann/json.hpp>

#include "base/outside_text.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

/// Texts made safe to show, however long; the body beside them has them as they are.
Json safe(const Json& value) {
  if (value.is_string()) return shown(value.get<std::string>(), 100000);
  if (!value.is_structured()) return value;
  Json copy = value.is_array() ? Json::array() : Json::object();
  for (const auto& [key, item] : value.items()) {
    if (value.is_array()) copy.push_back(safe(item));
    else copy[shown(key)] = safe(item);
  }
  return copy;
}

Json entry_document(const Entry& entry) {
  Json document{{"id", entry.id}};
  const Json body = Json::parse(entry.body, nullptr, false);
  for (const auto& [key, value] : body.items()) {
    if (key != "schema") document[shown(key)] = safe(value);
  }
  if (!document.contains("limits")) document["limits"] = Json::array();
  document["corrected_by"] = entry.corrected_by ? Json(*entry.corrected_by) : Json(nullptr);
  document["previous"] = entry.previous;
  document["hash"] = entry.hash;
  document["body"] = entry.body;
  return document;
}

Json text_or_null(const std::string& text) { return text.empty() ? Json(nullptr) : Json(json_safe(text)); }

}  // namespace

std::string ledger_json(std::span<const Entry> entries, const std::string& part, const LedgerHead& head,
                        const std::optional<MeasuredAgain>& again) {
  Json document{{"schema", "coilassay.ledger/1"}, {"part", text_or_null(part)}, {"last", head.id}, {"head", head.hash}};
  document["entries"] = Json::array();
  for (const Entry& entry : entries) document["entries"].push_back(entry_document(entry));
  if (again) {
    Json differences = Json::array();
    for (const auto& [where, recorded, now] : again->differences) {
      differences.push_back({{"where", json_safe(where)}, {"recorded", json_safe(recorded)}, {"now", json_safe(now)}});
    }
    document["again"] = {{"same", again->same()},
                         {"files", again->files},
                         {"recorded_by", text_or_null(again->recorded_by)},
                         {"program", again->program},
                         {"differences", std::move(differences)},
                         {"more", again->more}};
  }
  return json_text(document);
}

bool holds(const LedgerCheck& check, const std::optional<ExpectedHead>& expected) {
  return check.holds() && (!expected || expected->id);
}

std::string fault_in_words(const LedgerCheck& check, const std::optional<ExpectedHead>& expected) {
  if (check.holds()) {
    return expected && !expected->id ? "the chain holds, but no entry in it has the hash that was stated: entries at its end are missing, "
                                       "or this is another ledger"
                                     : "";
  }
  const LedgerFault& first = check.faults.front();
  std::string words = (first.id > 0 ? "entry " + std::to_string(first.id) + ": " : "") + first.what;
  const std::size_t more = check.faults.size() - 1;
  if (check.more_faults) words += ", and many more faults";
  else if (more > 0) words += ", and " + std::to_string(more) + (more == 1 ? " more fault" : " more faults");
  return words;
}

std::string verify_json(const LedgerCheck& check, const std::string& file, const std::optional<ExpectedHead>& expected) {
  Json document{{"schema", "coilassay.verify/1"},
                {"file", json_safe(file)},
                {"holds", holds(check, expected)},
                {"entries", check.entries},
                {"part", text_or_null(check.part)},
                {"last", check.head.id},
                {"head", check.head.hash}};
  document["expected_head"] =
      expected ? Json{{"hash", json_safe(expected->hash)}, {"id", expected->id ? Json(*expected->id) : Json(nullptr)}} : Json(nullptr);
  document["faults"] = Json::array();
  for (const LedgerFault& fault : check.faults) {
    document["faults"].push_back({{"id", fault.id > 0 ? Json(fault.id) : Json(nullptr)}, {"what", json_safe(fault.what)}});
  }
  document["more_faults"] = check.more_faults;
  if (!holds(check, expected)) {
    document["problem"] = name(Problem::ledger);
    document["place"] = json_safe(file);
    document["finding"] = json_safe(fault_in_words(check, expected));
    document["remedy"] = "keep the file as it is, and compare it with a copy that holds";
  }
  return json_text(document);
}

}  // namespace coilassay

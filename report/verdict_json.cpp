#include "report/verdict_json.h"

#include <array>
#include <cmath>
#include <nlohmann/json.hpp>

#include "report/json_writer.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

void add(Json& to, const char* key, const std::optional<double>& value) {
  to[key] = value && std::isfinite(*value) ? Json(*value) : Json(nullptr);
}

Json conditions(const LimitConditions& at) {
  Json object = Json::object();
  const auto named = [&object](const char* key, const std::optional<double>& value) {
    if (value) object[key] = *value;
  };
  named("frequency_Hz", at.frequency_hz);
  named("level_V", at.level_v);
  named("level_A", at.level_a);
  named("bias_A", at.bias_a);
  named("temperature_degC", at.temperature_degc);
  if (!at.definition.empty()) object["definition"] = at.definition;
  return object;
}

tl::unexpected<Error> broken() {
  return failure(Problem::ledger, "verdict", "the record of a verdict is not one this program writes",
                 "coilassay ledger verify says what is wrong");
}

bool take(const Json& from, const char* key, std::optional<double>& into) {
  const auto member = from.find(key);
  if (member == from.end() || member->is_null()) return true;
  if (!member->is_number()) return false;
  into = member->get<double>();
  return true;
}

bool take(const Json& from, const char* key, std::string& into) {
  const auto member = from.find(key);
  if (member == from.end() || member->is_null()) return true;
  if (!member->is_string()) return false;
  into = member->get<std::string>();
  return true;
}

Unit unit_named(const std::string& text) {
  for (const Unit each : {Unit::volt, Unit::ampere, Unit::ohm, Unit::siemens, Unit::henry, Unit::farad, Unit::hertz,
                          Unit::second, Unit::per_second, Unit::radian, Unit::weber, Unit::joule, Unit::watt,
                          Unit::degree_celsius, Unit::kelvin, Unit::ampere_per_volt, Unit::tesla, Unit::metre}) {
    if (symbol(each) == text) return each;
  }
  return Unit::one;
}

template <class Word>
std::optional<Word> word_of(const std::string& text, std::initializer_list<Word> words) {
  for (const Word each : words) {
    if (name(each) == text) return each;
  }
  return std::nullopt;
}

}  // namespace

Json limit_document(const LimitVerdict& v) {
  Json document = {{"quantity", v.quantity}, {"unit", symbol(v.unit)}};
  document["test"] = v.test.empty() ? Json(nullptr) : Json(json_safe(v.test));
  document["at"] = conditions(v.at);
  add(document, "value", v.value);
  add(document, "u", v.u);
  add(document, "u_own", v.u_own);
  add(document, "U", v.U);
  Json interval = Json::array();
  for (const auto& end : {v.low, v.high}) interval.push_back(end && std::isfinite(*end) ? Json(*end) : Json(nullptr));
  document["interval"] = std::move(interval);
  add(document, "min", v.min);
  add(document, "max", v.max);
  add(document, "guard", v.guard);
  add(document, "probability_conforming", v.p_conform);
  add(document, "capability", v.capability);
  document["verdict"] = name(v.verdict);
  document["why"] = json_safe(v.why);
  document["from"] = json_safe(v.from);
  return document;
}

Result<LimitVerdict> limit_of_document(const Json& document, const Limit& limit) {
  if (!document.is_object()) return broken();
  LimitVerdict v;
  v.unit = limit.unit;
  v.at = limit.at;
  std::string verdict;
  const bool fine = take(document, "quantity", v.quantity) && take(document, "test", v.test) &&
                    take(document, "value", v.value) && take(document, "u", v.u) && take(document, "u_own", v.u_own) &&
                    take(document, "U", v.U) && take(document, "min", v.min) && take(document, "max", v.max) &&
                    take(document, "guard", v.guard) && take(document, "probability_conforming", v.p_conform) &&
                    take(document, "capability", v.capability) && take(document, "why", v.why) &&
                    take(document, "from", v.from) && take(document, "verdict", verdict);
  const auto word = word_of(verdict, {Verdict::pass, Verdict::fail, Verdict::undecided, Verdict::not_comparable});
  if (!fine || !word || v.quantity != limit.quantity) return broken();
  v.verdict = *word;
  const auto interval = document.find("interval");
  if (interval == document.end() || !interval->is_array() || interval->size() != 2) return broken();
  for (std::size_t i = 0; i < 2; ++i) {
    const Json& end = (*interval)[i];
    if (end.is_number()) (i == 0 ? v.low : v.high) = end.get<double>();
    else if (!end.is_null()) return broken();
  }
  return v;
}

Result<std::vector<Finding>> findings_of_document(const Json& document) {
  if (!document.is_array()) return broken();
  std::vector<Finding> findings;
  for (const Json& item : document) {
    Finding finding;
    std::optional<double> figure;
    std::string severity, unit;
    if (!item.is_object() || !take(item, "code", finding.code) || !take(item, "message", finding.message) ||
        !take(item, "severity", severity) || !take(item, "figure", figure) || !take(item, "about", finding.about) ||
        !take(item, "unit", unit)) {
      return broken();
    }
    const auto word = word_of(severity, {Severity::note, Severity::caution, Severity::refusal});
    if (!word) return broken();
    finding.severity = *word;
    finding.figure = figure.value_or(std::nan(""));
    finding.unit = unit_named(unit);
    findings.push_back(std::move(finding));
  }
  return findings;
}

Result<std::vector<Caution>> cautions_of_document(const Json& document) {
  if (!document.is_array()) return broken();
  std::vector<Caution> cautions;
  for (const Json& item : document) {
    Caution caution;
    std::optional<double> figure;
    std::string severity, unit;
    if (!item.is_object() || !take(item, "code", caution.code) || !take(item, "message", caution.message) ||
        !take(item, "severity", severity) || !take(item, "figure", figure) || !take(item, "basis", caution.basis) ||
        !take(item, "unit", unit)) {
      return broken();
    }
    const auto word = word_of(severity, {Severity::note, Severity::caution, Severity::refusal});
    if (!word) return broken();
    caution.severity = *word;
    caution.figure = figure.value_or(std::nan(""));
    caution.unit = unit_named(unit);
    cautions.push_back(std::move(caution));
  }
  return cautions;
}

}  // namespace coilassay

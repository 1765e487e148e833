// Names in files and words for people of everything the room speaks of.
#include <fmt/format.h>

#include <algorithm>

#include "base/number_text.h"
#include "inspection/part_sheet.h"
#include "inspection/readiness.h"
#include "inspection/sampling.h"
#include "inspection/verdict.h"
#include "inspection/words.h"

namespace coilassay {

std::string_view name(DecisionRule rule) {
  switch (rule) {
    case DecisionRule::simple: return "simple";
    case DecisionRule::guarded_acceptance: return "guarded_acceptance";
    case DecisionRule::guarded: return "guarded";
    case DecisionRule::guarded_rejection: return "guarded_rejection";
  }
  return "";
}

std::string_view name(SamplingScheme scheme) {
  switch (scheme) {
    case SamplingScheme::attributes: return "attributes";
    case SamplingScheme::variables: return "variables";
    case SamplingScheme::claim: return "claim";
    case SamplingScheme::all: return "all";
  }
  return "";
}

std::string_view name(Severity105 severity) {
  switch (severity) {
    case Severity105::normal: return "normal";
    case Severity105::tightened: return "tightened";
    case Severity105::reduced: return "reduced";
    case Severity105::discontinued: return "discontinued";
  }
  return "";
}

std::string_view name(Verdict verdict) {
  switch (verdict) {
    case Verdict::pass: return "pass";
    case Verdict::fail: return "fail";
    case Verdict::undecided: return "undecided";
    case Verdict::not_comparable: return "not_comparable";
  }
  return "";
}

std::string_view name(LotResult result) {
  switch (result) {
    case LotResult::accept: return "accept";
    case LotResult::reject: return "reject";
    case LotResult::undecided: return "undecided";
  }
  return "";
}

std::string_view name(CheckState state) {
  switch (state) {
    case CheckState::good: return "good";
    case CheckState::out: return "out";
    case CheckState::overdue: return "overdue";
    case CheckState::never: return "never";
    case CheckState::not_established: return "not_established";
  }
  return "";
}

std::string percent_in_words(double ratio) { return fmt::format("{:.4g} %", 100 * ratio); }

std::string stated_in_words(double value, Unit unit) {
  std::string text = to_text(value, unit, Script::utf8, 7);
  const std::size_t point = text.find('.'), end = std::min(text.find(' '), text.size());
  if (point >= end) return text;
  std::size_t last = end;
  while (text[last - 1] == '0') --last;
  if (text[last - 1] == '.') --last;
  return text.erase(last, end - last);
}

std::string limits_in_words(const Limit& limit) {
  const auto text = [&](double value) { return stated_in_words(value, limit.unit); };
  if (limit.min && limit.max) return fmt::format("{} to {}", text(*limit.min), text(*limit.max));
  if (limit.min) return "at least " + text(*limit.min);
  return limit.max ? "at most " + text(*limit.max) : "no limit";
}

std::string conditions_in_words(const LimitConditions& at) {
  std::string words;
  const auto add = [&](const std::string& part) { words += (words.empty() ? "at " : ", ") + part; };
  if (at.frequency_hz) add(stated_in_words(*at.frequency_hz, Unit::hertz));
  if (at.level_v) add(stated_in_words(*at.level_v, Unit::volt));
  if (at.level_a) add(stated_in_words(*at.level_a, Unit::ampere));
  if (at.bias_a) add("bias " + stated_in_words(*at.bias_a, Unit::ampere));
  if (at.temperature_degc) add(stated_in_words(*at.temperature_degc, Unit::degree_celsius));
  if (!at.definition.empty()) words += (words.empty() ? "by " : ", by ") + at.definition;
  return words;
}

}  // namespace coilassay

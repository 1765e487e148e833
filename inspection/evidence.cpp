#include "inspection/evidence.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "analysis/symbols.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "inspection/words.h"

namespace coilassay {

namespace {

/// One value found in a measurement, before its conditions are looked at.
struct Candidate {
  const Estimate* estimate = nullptr;
  Conditions conditions;
  std::string from;
  bool of_result = true;  // of the whole measurement, not of a point
};

/// A limit on I_sat_30 by the secant is one on I_sat_30_secant.
bool same_symbol(const Limit& limit, const std::string& symbol) {
  return symbol == limit.quantity || (limit.at.definition == "ramp_secant" && symbol == limit.quantity + "_secant");
}

std::vector<Candidate> candidates_in(const Measurement& measurement, const Limit& limit) {
  std::vector<Candidate> found;
  for (const Estimate& estimate : measurement.estimates) {
    if (!same_symbol(limit, estimate.symbol)) continue;
    Candidate candidate{&estimate, measurement.conditions, "measured", true};
    if (estimate.at_hz) candidate.conditions.frequency_hz = estimate.at_hz;
    found.push_back(candidate);
  }
  for (const Point& point : measurement.points) {
    for (const Estimate& estimate : point.estimates) {
      if (!same_symbol(limit, estimate.symbol)) continue;
      Candidate candidate{&estimate, measurement.conditions, point.from, false};
      if (point.at_hz) candidate.conditions.frequency_hz = point.at_hz;
      if (estimate.at_hz) candidate.conditions.frequency_hz = estimate.at_hz;
      if (point.level_a) candidate.conditions.level_a = point.level_a;
      if (point.bias_a) candidate.conditions.bias_a = point.bias_a;
      const auto at = candidate.conditions.frequency_hz;
      if (point.from == "model" && at) candidate.from = "model at " + to_text(*at, Unit::hertz);
      if (point.from.empty() || point.from == "data") candidate.from = "measured";
      found.push_back(candidate);
    }
  }
  return found;
}

double allowed_distance(double stated, const ConditionTolerance& tolerance) {
  return tolerance.relative ? tolerance.value * std::fabs(stated) : tolerance.value;
}

bool near(double is, double stated, const ConditionTolerance& tolerance) {
  const double allowed = allowed_distance(stated, tolerance);
  // A value on the edge of its tolerance is within it, rounding or not.
  return std::fabs(is - stated) <= allowed + 1e-9 * std::max(std::fabs(stated), allowed);
}

/// Why the condition does not fit; empty when it does, or when the limit does not name it.
std::string misfit(std::string_view what, const std::optional<double>& stated, const std::optional<double>& is,
                   const ConditionTolerance& tolerance, Unit unit) {
  if (!stated) return {};
  if (!is) return fmt::format("the {} is not known, stated {}", what, stated_in_words(*stated, unit));
  if (near(*is, *stated, tolerance)) return {};
  const std::string allowed = tolerance.relative ? percent_in_words(tolerance.value) : stated_in_words(tolerance.value, unit == Unit::degree_celsius ? Unit::kelvin : unit);
  return fmt::format("{} {}, stated {} within {}", what, to_text(*is, unit), stated_in_words(*stated, unit), allowed);
}

/// The temperature a quantity refers to by its definition.
std::optional<double> temperature_by_definition(const std::string& symbol) {
  if (symbol == "R_dc_20") return 20.0;
  return std::nullopt;
}

std::string why_not_comparable(const Candidate& candidate, const LimitConditions& at, const ConditionTolerances& tolerances) {
  const Conditions& is = candidate.conditions;
  if (!at.definition.empty() && candidate.estimate->definition != at.definition) {
    return candidate.estimate->definition.empty()
               ? fmt::format("the definition is not known, stated {}", at.definition)
               : fmt::format("definition {}, stated {}", candidate.estimate->definition, at.definition);
  }
  auto temperature = temperature_by_definition(candidate.estimate->symbol);
  if (!temperature) temperature = is.temperature_degc;
  const ConditionTolerances& t = tolerances;
  for (const std::string& reason : {misfit("frequency", at.frequency_hz, is.frequency_hz, t.frequency, Unit::hertz),
                                    misfit("level", at.level_v, is.level_v, t.level, Unit::volt),
                                    misfit("level", at.level_a, is.level_a, t.level, Unit::ampere),
                                    misfit("bias", at.bias_a, is.bias_a, t.bias, Unit::ampere),
                                    misfit("temperature", at.temperature_degc, temperature, t.temperature, Unit::degree_celsius)}) {
    if (!reason.empty()) return reason;
  }
  return {};
}

/// How far the conditions of a comparable value are from the stated ones, in parts of what is allowed.
double distance(const Candidate& candidate, const LimitConditions& at, const ConditionTolerances& tolerances) {
  double sum = 0;
  const auto add = [&](const std::optional<double>& stated, const std::optional<double>& is, const ConditionTolerance& tolerance) {
    if (stated && is && *is != *stated) sum += std::fabs(*is - *stated) / std::max(allowed_distance(*stated, tolerance), 1e-300);
  };
  const Conditions& is = candidate.conditions;
  add(at.frequency_hz, is.frequency_hz, tolerances.frequency);
  add(at.level_v, is.level_v, tolerances.level);
  add(at.level_a, is.level_a, tolerances.level);
  add(at.bias_a, is.bias_a, tolerances.bias);
  add(at.temperature_degc, is.temperature_degc, tolerances.temperature);
  return sum;
}

/// Share of the standard uncertainty that is the unit's own, from the budget of the symbol.
std::optional<double> own_share(const Measurement& measurement, const std::string& symbol) {
  const auto lines = measurement.budget.find(symbol);
  if (lines == measurement.budget.end() || lines->second.empty()) return std::nullopt;
  double own = 0, all = 0;
  for (const BudgetLine& line : lines->second) {
    all += line.u * line.u;
    if (!line.common) own += line.u * line.u;
  }
  return all > 0 ? std::sqrt(own / all) : 0;
}

std::string why_missing(const Measurement& measurement, const std::string& quantity) {
  for (const Finding& finding : measurement.findings) {
    if (finding.severity == Severity::refusal && (finding.about.empty() || finding.about == quantity)) return finding.message;
  }
  for (const Finding& finding : measurement.findings) {
    if (finding.severity == Severity::refusal) return finding.message;
  }
  const Symbol* symbol = find_symbol(quantity);
  return fmt::format("{} was not established", symbol != nullptr ? symbol->words : std::string_view(quantity));
}

/// Bounds carry no conditions of their own; those of the measurement hold, and the definition its test works by.
std::string bound_misfit(const Bound& bound, const Measurement& measurement, const Limit& limit, const ConditionTolerances& tolerances) {
  Estimate as_if;
  as_if.symbol = bound.symbol;
  if (bound.symbol.starts_with("I_sat")) {
    as_if.definition = bound.symbol.ends_with("secant") ? "ramp_secant"
                       : measurement.test == "sine"     ? "bias_small_signal"
                                                        : "ramp_incremental";
  }
  return why_not_comparable({&as_if, measurement.conditions, "", true}, limit.at, tolerances);
}

}  // namespace

Evidence evidence_of(const Limit& limit, const ConditionTolerances& tolerances, const std::string& test,
                     std::span<const TestedUnit* const> repeats) {
  Evidence evidence;
  evidence.test = test;
  evidence.repeats = repeats.size();
  for (const TestedUnit* tested : repeats) {
    const Measurement& measurement = tested->measurement;
    const std::vector<Candidate> candidates = candidates_in(measurement, limit);
    const Candidate* best = nullptr;
    std::string reason;
    for (const Candidate& candidate : candidates) {
      const std::string misfit = why_not_comparable(candidate, limit.at, tolerances);
      if (!misfit.empty()) {
        if (reason.empty()) reason = misfit;
        continue;
      }
      if (best == nullptr || distance(candidate, limit.at, tolerances) < distance(*best, limit.at, tolerances)) best = &candidate;
    }
    if (best != nullptr) {
      const double u = best->estimate->quantity.standard_uncertainty;
      const auto share = own_share(measurement, best->estimate->symbol);
      evidence.values.push_back({*best->estimate, share ? std::optional<double>(*share * u) : std::nullopt, best->from});
      continue;
    }
    if (!candidates.empty()) {
      if (evidence.not_comparable.empty()) evidence.not_comparable = reason;
      continue;
    }
    bool bounded = false;
    for (const Bound& bound : measurement.bounds) {
      if (!same_symbol(limit, bound.symbol)) continue;
      const std::string misfit = bound_misfit(bound, measurement, limit, tolerances);
      if (misfit.empty()) {
        evidence.bounds.push_back(bound);
        bounded = true;
      } else if (evidence.not_comparable.empty()) {
        evidence.not_comparable = misfit;
      }
    }
    if (!bounded && evidence.missing.empty()) {
      evidence.missing = why_missing(measurement, limit.quantity);
    }
  }
  return evidence;
}

}  // namespace coilassay

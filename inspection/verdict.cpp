#include "inspection/verdict.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "base/number_text.h"
#include "base/outside_text.h"
#include "inspection/evidence.h"
#include "inspection/repeats.h"
#include "inspection/rules.h"
#include "inspection/words.h"

namespace coilassay {

namespace {

constexpr double kPoorCapability = 4;  // test uncertainty ratio below which a note is worth its ink; 1: nothing bare passes

/// Of the nearest limit: its name, and how far inside the value lies (negative: outside).
struct Nearest {
  std::string_view limit;
  double inside = 0;
};
Nearest nearest_limit(double value, const std::optional<double>& min, const std::optional<double>& max) {
  const double above_min = min ? value - *min : HUGE_VAL, below_max = max ? *max - value : HUGE_VAL;
  return above_min < below_max ? Nearest{"min", above_min} : Nearest{"max", below_max};
}

std::string why_in_words(const LimitVerdict& v, const Decision& decision, bool nothing_can_pass) {
  const auto text = [&](double x) { return to_text(x, v.unit, Script::utf8, 3); };
  const Nearest nearest = nearest_limit(*v.value, v.min, v.max);
  const double guard = v.guard.value_or(0);
  std::string place = nearest.inside >= 0 ? fmt::format("{} inside {}", text(nearest.inside), nearest.limit)
                                          : fmt::format("{} outside {}", text(-nearest.inside), nearest.limit);
  if (nearest.inside == 0) place = fmt::format("on {}", nearest.limit);
  if (decision.rule == DecisionRule::simple) return place;
  if (nothing_can_pass) {
    return fmt::format("{}; the interval is wider than the limits allow, so that no value can pass", place);
  }
  const std::string band = fmt::format("{}; the guard band is {}", place, text(guard));
  if (v.verdict == Verdict::undecided) return band + ", so neither is shown";
  return band;
}

/// What the limits, the conditions and the names say before anything is measured.
LimitVerdict blank(const Limit& limit) {
  LimitVerdict v;
  v.quantity = limit.quantity;
  v.unit = limit.unit;
  v.at = limit.at;
  v.min = limit.min;
  v.max = limit.max;
  return v;
}

void judge_value(LimitVerdict& v, const EvidenceValue& evidence, const PartSheet& sheet) {
  const Estimate& estimate = evidence.estimate;
  v.value = estimate.quantity.value;
  v.from = evidence.from;
  v.u_own = evidence.u_own;
  auto law = ValueLaw::of(estimate);
  if (!law) {
    const bool inside = (!v.min || *v.value >= *v.min) && (!v.max || *v.value <= *v.max);
    const bool simple = sheet.decision.rule == DecisionRule::simple;
    v.verdict = !simple ? Verdict::undecided : inside ? Verdict::pass : Verdict::fail;
    v.why = simple ? why_in_words(v, sheet.decision, false)
                   : "the uncertainty of the value is not known, and the rule needs it: state the accuracy of what measured it";
    return;
  }
  double sigma = 0;
  if (const auto gauge = sheet.gauge_sigma.find(v.quantity); gauge != sheet.gauge_sigma.end()) sigma = gauge->second;
  if (sigma > 0) {
    law = law->widened(sigma);
    v.u_own = std::hypot(evidence.u_own.value_or(0), sigma);
  }
  v.u = law->u();
  v.U = sigma > 0 || !(estimate.low <= estimate.high) ? law->half_width() : estimate.half_width();
  v.low = sigma > 0 || !(estimate.low <= estimate.high) ? law->low() : estimate.low;
  v.high = sigma > 0 || !(estimate.low <= estimate.high) ? law->high() : estimate.high;
  if (v.min && v.max && *v.U > 0 && std::isfinite(*v.U)) v.capability = (*v.max - *v.min) / (2 * *v.U);
  const RuleOutcome outcome = apply_rule(sheet.decision, *law, v.min, v.max);
  v.verdict = outcome.verdict;
  v.guard = outcome.guard;
  v.p_conform = outcome.p_conform;
  v.why = why_in_words(v, sheet.decision, outcome.nothing_can_pass);
}

/// What a bound alone can decide: the value lies on one side of it, with its confidence.
void judge_bound(LimitVerdict& v, const Bound& bound, const Decision& decision) {
  v.from = "bound";
  const auto text = [&](double x) { return to_text(x, v.unit); };
  const bool sure_enough = decision.rule == DecisionRule::simple || bound.confidence >= 1 - decision.risk - 1e-12;
  const std::string known = bound.at_least ? "known to be at least " + text(*bound.at_least)
                                           : "known to be at most " + text(bound.at_most.value_or(std::nan("")));
  const bool above_min = !v.min || (bound.at_least && *bound.at_least >= *v.min);
  const bool below_max = !v.max || (bound.at_most && *bound.at_most <= *v.max);
  const bool outside = (v.max && bound.at_least && *bound.at_least > *v.max) || (v.min && bound.at_most && *bound.at_most < *v.min);
  if (outside && sure_enough) {
    v.verdict = Verdict::fail;
    v.why = known + ", which is outside the limits";
  } else if (above_min && below_max && sure_enough) {
    v.verdict = Verdict::pass;
    v.why = known + ", which is inside the limits";
  } else {
    v.verdict = Verdict::undecided;
    v.why = known + ", which does not decide";
  }
}

std::string nothing_measured(const Limit& limit, const PartSheet& sheet) {
  if (!limit.test.empty()) return fmt::format("there is no {} of this unit", shown(limit.test, 60));
  std::string kinds;
  for (const TestPlan& test : sheet.tests) {
    if (limit_uses(limit, test)) kinds += (kinds.empty() ? "" : " or ") + test.name;
  }
  return kinds.empty() ? fmt::format("no test of this unit gives {}", limit.quantity)
                       : fmt::format("there is no {} of this unit", kinds);
}

/// A test that has no section of its own is called by its kind.
TestPlan plan_of(const PartSheet& sheet, const std::string& test) {
  if (const TestPlan* plan = sheet.find_test(test)) return *plan;
  TestPlan plan;
  plan.name = plan.kind = test;
  return plan;
}

/// The evidence that counts: the first test, in the order given, that has a comparable value, else a bound, else a value
/// that cannot be compared, else the first reason for having none. One repeat at other conditions makes the test not
/// comparable: nobody knows whether the others were not.
std::optional<Evidence> gather(const Limit& limit, const PartSheet& sheet, std::span<const TestedUnit> measured) {
  std::vector<std::string> tests;
  for (const TestedUnit& tested : measured) {
    if (std::find(tests.begin(), tests.end(), tested.test) == tests.end()) tests.push_back(tested.test);
  }
  std::optional<Evidence> best;
  const auto rank = [](const Evidence& e) {
    return !e.not_comparable.empty() ? 1 : !e.values.empty() ? 3 : !e.bounds.empty() ? 2 : 0;
  };
  for (const std::string& test : tests) {
    if (!limit_uses(limit, plan_of(sheet, test))) continue;
    std::vector<const TestedUnit*> repeats;
    for (const TestedUnit& tested : measured) {
      if (tested.test == test) repeats.push_back(&tested);
    }
    Evidence evidence = evidence_of(limit, sheet.tolerances, test, repeats);
    if (!best || rank(evidence) > rank(*best)) best = std::move(evidence);
  }
  return best;
}

void add_findings(UnitVerdict& unit, const LimitVerdict& v, const Decision& decision) {
  if (v.verdict == Verdict::not_comparable) {
    unit.findings.push_back({"not_comparable", Severity::refusal, fmt::format("{}: not comparable, {}", v.quantity, v.why),
                             v.quantity, v.value.value_or(std::nan("")), v.unit});
    return;
  }
  if (!v.capability) return;
  const double c = *v.capability;
  const double span = *v.max - *v.min;
  const bool none = decision.rule != DecisionRule::simple && decision.rule != DecisionRule::guarded_rejection &&
                    v.guard && 2 * *v.guard >= span;
  if (none || c < 1) {
    unit.findings.push_back({"guard_band_too_wide", Severity::caution,
                             fmt::format("{}: the interval is ±{} where the limits are {} apart; {}", v.quantity,
                                         to_text(*v.U, v.unit, Script::utf8, 2), to_text(span, v.unit, Script::utf8, 3),
                                         none ? "no value can pass: measure better, or agree on a larger risk"
                                              : "a verdict says little: measure better"),
                             v.quantity, c, Unit::one});
  } else if (c < kPoorCapability) {
    unit.findings.push_back({"guard_band_too_wide", Severity::note,
                             fmt::format("{}: the tolerance is {:.2g} times the uncertainty (both as half-widths), where 4 is good practice",
                                         v.quantity, c),
                             v.quantity, c, Unit::one});
  }
}

}  // namespace

LimitVerdict judge_limit(const Limit& limit, const PartSheet& sheet, std::span<const TestedUnit> measured) {
  LimitVerdict v = blank(limit);
  const std::optional<Evidence> evidence = gather(limit, sheet, measured);
  if (!evidence) {
    v.why = nothing_measured(limit, sheet);
    return v;
  }
  v.test = evidence->test;
  if (!evidence->not_comparable.empty()) {
    v.verdict = Verdict::not_comparable;
    v.why = evidence->not_comparable;
  } else if (!evidence->values.empty()) {
    judge_value(v, mean_of_repeats(evidence->values), sheet);
    const std::size_t lost = evidence->repeats - evidence->values.size();
    if (lost > 0) v.why += fmt::format("; {} of {} repeats gave no value", lost, evidence->repeats);
  } else if (!evidence->bounds.empty()) {
    judge_bound(v, evidence->bounds.front(), sheet.decision);
  } else {
    v.why = evidence->missing;
  }
  return v;
}

Verdict combined(std::span<const LimitVerdict> limits) {
  const auto any = [&](Verdict verdict) {
    return std::any_of(limits.begin(), limits.end(), [&](const LimitVerdict& v) { return v.verdict == verdict; });
  };
  if (limits.empty()) return Verdict::undecided;
  if (any(Verdict::fail)) return Verdict::fail;
  if (any(Verdict::not_comparable)) return Verdict::not_comparable;
  if (any(Verdict::undecided)) return Verdict::undecided;
  return Verdict::pass;
}

UnitVerdict judge_unit(const PartSheet& sheet, const std::string& serial, std::uint64_t attempt,
                       std::span<const TestedUnit> measured) {
  UnitVerdict unit;
  unit.serial = serial;
  unit.attempt = attempt;
  for (const Limit& limit : sheet.limits) {
    unit.limits.push_back(judge_limit(limit, sheet, measured));
    add_findings(unit, unit.limits.back(), sheet.decision);
  }
  unit.verdict = combined(unit.limits);
  return unit;
}

LimitVerdict judge_again(const LimitVerdict& before, const EvidenceValue& mean, const PartSheet& sheet) {
  LimitVerdict v = before;
  PartSheet without_gauge = sheet;  // what an attempt states holds the gauge's part already
  without_gauge.gauge_sigma.clear();
  judge_value(v, mean, without_gauge);
  return v;
}

std::string rule_in_words(const Decision& decision) {
  const std::string risk = percent_in_words(decision.risk), sure = percent_in_words(1 - decision.risk);
  switch (decision.rule) {
    case DecisionRule::simple:
      return "simple acceptance: a value inside the limits passes, any other fails; a unit on a limit is judged wrongly half the time";
    case DecisionRule::guarded_acceptance:
      return fmt::format("guarded acceptance: a unit passes when it conforms with a probability of at least {}, given its value, and fails "
                         "otherwise; this limits the risk of passing what does not conform to {}",
                         sure, risk);
    case DecisionRule::guarded:
      return fmt::format("guarded: a unit passes when it conforms, and fails when it does not, with a probability of at least {}, given its "
                         "value; between it is undecided. This limits both risks, of a wrong pass and of a wrong fail, to {}",
                         sure, risk);
    case DecisionRule::guarded_rejection:
      return fmt::format("guarded rejection: a unit fails when it does not conform with a probability of at least {}, given its value, and "
                         "passes otherwise; this limits the risk of failing what conforms to {}",
                         sure, risk);
  }
  return {};
}

}  // namespace coilassay

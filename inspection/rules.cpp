#include "inspection/rules.h"

#include <algorithm>
#include <cmath>

namespace coilassay {

namespace {

/// The value between two limits at which a unit is most likely to conform; the probability rises to it and falls after it.
double best_value(const ValueLaw& law, double min, double max) {
  double low = min, high = max;
  if (law.symmetric()) return (min + max) / 2;
  for (int i = 0; i < 100; ++i) {
    const double a = low + (high - low) / 3, b = high - (high - low) / 3;
    if (law.about(a).inside(min, max) < law.about(b).inside(min, max)) {
      low = a;
    } else {
      high = b;
    }
  }
  return (low + high) / 2;
}

/// Guard band of a pass: how far inside the nearest limit the value must lie. With two limits the other one counts too.
double guard_inside(const ValueLaw& law, double risk, std::optional<double> min, std::optional<double> max, bool& none) {
  if (!max) return law.reach_down(risk);
  if (!min) return law.reach_up(risk);
  const bool near_min = law.value() - *min < *max - law.value();
  const double best = best_value(law, *min, *max);
  none = law.about(best).inside(min, max) < 1 - risk;
  if (none) return near_min ? law.reach_down(risk) : law.reach_up(risk);
  double in = best, out = near_min ? *min : *max;
  for (int i = 0; i < 60; ++i) {
    const double middle = (in + out) / 2;
    (law.about(middle).inside(min, max) >= 1 - risk ? in : out) = middle;
  }
  return near_min ? in - *min : *max - in;
}

/// Guard band of a fail: how far outside the nearest limit the value must lie.
double guard_outside(const ValueLaw& law, double risk, std::optional<double> min, std::optional<double> max) {
  const bool near_min = min && (!max || law.value() - *min < *max - law.value());
  return near_min ? law.reach_up(risk) : law.reach_down(risk);
}

}  // namespace

RuleOutcome apply_rule(const Decision& decision, const ValueLaw& law, std::optional<double> min, std::optional<double> max) {
  RuleOutcome outcome;
  outcome.p_below = min ? law.below(*min) : 0;
  outcome.p_above = max ? law.above(*max) : 0;
  outcome.p_conform = law.inside(min, max);
  const double risk = decision.risk;
  const bool inside = (!min || law.value() >= *min) && (!max || law.value() <= *max);
  const bool proven_good = inside && outcome.p_below + outcome.p_above <= risk;
  const bool proven_bad = !inside && std::max(outcome.p_below, outcome.p_above) >= 1 - risk;
  bool none = false;
  const double guard = guard_inside(law, risk, min, max, none);
  switch (decision.rule) {
    case DecisionRule::simple:
      outcome.verdict = inside ? Verdict::pass : Verdict::fail;
      break;
    case DecisionRule::guarded_acceptance:
      outcome.verdict = proven_good ? Verdict::pass : Verdict::fail;
      outcome.guard = guard;
      outcome.nothing_can_pass = none;
      break;
    case DecisionRule::guarded:
      outcome.verdict = proven_good ? Verdict::pass : proven_bad ? Verdict::fail : Verdict::undecided;
      outcome.guard = guard;
      outcome.nothing_can_pass = none;
      break;
    case DecisionRule::guarded_rejection:
      outcome.verdict = proven_bad ? Verdict::fail : Verdict::pass;
      outcome.guard = guard_outside(law, risk, min, max);
      break;
  }
  return outcome;
}

}  // namespace coilassay

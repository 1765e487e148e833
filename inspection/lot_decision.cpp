// From the verdicts of a sample to a decision on the lot.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "base/number_text.h"
#include "fitting/statistics.h"
#include "inspection/lot_statistics.h"
#include "inspection/sampling.h"

namespace coilassay {

namespace {

std::string units_in_words(std::uint64_t n) { return n == 1 ? "1 unit" : fmt::format("{} units", n); }

void decide_by_count(LotDecision& lot, const SamplingPlan& plan, bool set_aside) {
  const std::uint64_t open = lot.counts.undecided + lot.counts.not_comparable;
  const std::uint64_t bad = lot.counts.nonconforming + (set_aside ? 0 : open);
  const std::uint64_t worst = bad + (set_aside ? open : 0);
  std::string seen = fmt::format("{} of {} nonconforming", lot.counts.nonconforming, lot.counts.inspected);
  if (open > 0) {
    seen += set_aside ? fmt::format(", {} undecided and set aside", open) : fmt::format(", {} undecided and counted with them", open);
  }
  if (bad >= plan.reject) {
    lot.decision = LotResult::reject;
    lot.why = fmt::format("{}; {}", seen, plan.reject == 1 ? "1 rejects the lot" : fmt::format("{} reject the lot", plan.reject));
  } else if (worst < plan.reject) {
    lot.decision = LotResult::accept;
    lot.between_accept_and_reject = bad > plan.accept;
    lot.why = lot.between_accept_and_reject
                  ? fmt::format("{}; up to {} are allowed, and this lies between that and {}: accepted, and normal inspection comes back", seen,
                                plan.accept, plan.reject)
                  : fmt::format("{}; {}", seen, plan.accept == 0 ? "none is allowed" : fmt::format("up to {} are allowed", plan.accept));
  } else {
    lot.decision = LotResult::undecided;
    lot.why = fmt::format("{}; with what is set aside it could be {} and {} would reject the lot", seen, worst, plan.reject);
  }
}

/// What a variables plan is decided from.
struct Values {
  std::vector<double> values;
  double u_common = 0;   // largest part of the uncertainty that all units share
  double u_own = 0;      // root mean square of the units' own parts
};

std::optional<Values> values_of(const std::string& quantity, std::span<const UnitVerdict> sample, std::optional<double>& min,
                                std::optional<double>& max) {
  Values out;
  double own_squares = 0;
  for (const UnitVerdict& unit : sample) {
    const auto found = std::find_if(unit.limits.begin(), unit.limits.end(),
                                    [&](const LimitVerdict& v) { return v.quantity == quantity; });
    if (found == unit.limits.end() || !found->value || found->verdict == Verdict::not_comparable) return std::nullopt;
    out.values.push_back(*found->value);
    const double u = found->u.value_or(0), own = std::min(found->u_own.value_or(u), u);
    out.u_common = std::max(out.u_common, std::sqrt(u * u - own * own));
    own_squares += own * own;
    min = found->min;
    max = found->max;
  }
  if (out.values.size() < 3) return std::nullopt;
  out.u_own = std::sqrt(own_squares / static_cast<double>(out.values.size()));
  return out;
}

/// Whether the plan accepts when the mean is moved by `shift`.
bool accepts(const LotDecision& lot, double k, std::uint64_t n, const std::optional<double>& min, const std::optional<double>& max,
             double shift) {
  const double upper = max ? (*max - *lot.mean - shift) / *lot.deviation : HUGE_VAL;
  const double lower = min ? (*lot.mean + shift - *min) / *lot.deviation : HUGE_VAL;
  if (!max) return lower >= k;
  if (!min) return upper >= k;
  return estimated_fraction_beyond(upper, n) + estimated_fraction_beyond(lower, n) <= estimated_fraction_beyond(k, n);
}

void decide_by_variables(LotDecision& lot, const PartSheet& sheet, const SamplingPlan& plan, std::span<const UnitVerdict> sample) {
  std::optional<double> min, max;
  const auto values = values_of(sheet.sampling.quantity, sample, min, max);
  if (!values) {
    lot.why = fmt::format("not every unit of the sample has a comparable value of {}", sheet.sampling.quantity);
    return;
  }
  const Summary summary = summarise(values->values);
  lot.mean = summary.mean;
  lot.deviation = summary.standard_deviation;
  if (!(summary.standard_deviation > 0)) {
    lot.why = "all values are equal: their deviation says nothing about the lot";
    return;
  }
  const std::uint64_t n = values->values.size();
  if (max) lot.upper_index = (*max - *lot.mean) / *lot.deviation;
  if (min) lot.lower_index = (*lot.mean - *min) / *lot.deviation;
  lot.fraction_estimated = (max ? estimated_fraction_beyond(*lot.upper_index, n) : 0) +
                           (min ? estimated_fraction_beyond(*lot.lower_index, n) : 0);
  // What all units share moves the mean; it is guarded by the rule of the sheet.
  const Decision& decision = sheet.decision;
  const double guard = decision.rule == DecisionRule::simple ? 0 : normal_quantile(1 - decision.risk) * values->u_common;
  int accepted = 0;
  constexpr int kShifts = 5;
  for (int i = 0; i < kShifts; ++i) {
    accepted += accepts(lot, *plan.k, n, min, max, guard * (2.0 * i / (kShifts - 1) - 1)) ? 1 : 0;
  }
  const bool all = accepted == kShifts, none = accepted == 0;
  switch (decision.rule) {
    case DecisionRule::simple:
    case DecisionRule::guarded_acceptance: lot.decision = all ? LotResult::accept : LotResult::reject; break;
    case DecisionRule::guarded: lot.decision = all ? LotResult::accept : none ? LotResult::reject : LotResult::undecided; break;
    case DecisionRule::guarded_rejection: lot.decision = none ? LotResult::reject : LotResult::accept; break;
  }
  const Unit unit = sample.front().limits.empty() ? Unit::one : [&] {
    for (const LimitVerdict& v : sample.front().limits) {
      if (v.quantity == sheet.sampling.quantity) return v.unit;
    }
    return Unit::one;
  }();
  lot.why = fmt::format("mean {}, standard deviation {}", to_text(*lot.mean, unit), to_text(*lot.deviation, unit, Script::utf8, 3));
  if (min) lot.why += fmt::format("; (mean - min)/s = {:.3f}", *lot.lower_index);
  if (max) lot.why += fmt::format("; (max - mean)/s = {:.3f}", *lot.upper_index);
  if (min && max) {
    lot.why += fmt::format("; {} estimated to be outside, up to {} is accepted", to_percent_text(*lot.fraction_estimated),
                           to_percent_text(estimated_fraction_beyond(*plan.k, n)));
  } else {
    lot.why += fmt::format("; k = {} is needed", to_shortest(*plan.k));
  }
  if (guard > 0 && !all && !none) lot.why += fmt::format("; what all units share (±{}) could turn it", to_text(guard, unit, Script::utf8, 2));
}

}  // namespace

LotCounts count(std::span<const UnitVerdict> sample) {
  LotCounts counts;
  for (const UnitVerdict& unit : sample) {
    ++counts.inspected;
    if (unit.verdict == Verdict::fail) ++counts.nonconforming;
    if (unit.verdict == Verdict::undecided) ++counts.undecided;
    if (unit.verdict == Verdict::not_comparable) ++counts.not_comparable;
  }
  return counts;
}

LotDecision decide_lot(const PartSheet& sheet, const SamplingPlan& plan, std::span<const UnitVerdict> sample) {
  LotDecision lot;
  lot.counts = count(sample);
  if (sample.size() < plan.n) {
    lot.why = fmt::format("{} inspected, and the plan asks for {}", units_in_words(sample.size()), plan.n);
    return lot;
  }
  if (plan.scheme == SamplingScheme::variables) {
    decide_by_variables(lot, sheet, plan, sample);
  } else {
    decide_by_count(lot, plan, sheet.sampling.undecided_set_aside);
  }
  return lot;
}

}  // namespace coilassay

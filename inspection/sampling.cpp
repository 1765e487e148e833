#include "inspection/sampling.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>
#include <set>

#include "base/number_text.h"
#include "base/random.h"
#include "inspection/lot_statistics.h"
#include "inspection/sampling_tables.h"
#include "inspection/words.h"

namespace coilassay {

namespace {

tl::unexpected<Error> no_plan(std::string finding, std::string remedy) {
  return failure(Problem::usage, "sampling", std::move(finding), std::move(remedy));
}

std::string accept_in_words(const SamplingPlan& plan) {
  const std::string most = plan.accept == 0 ? "none may be nonconforming" : fmt::format("up to {} may be nonconforming", plan.accept);
  return plan.reject == plan.accept + 1 ? most : fmt::format("{}, {} reject the lot", most, plan.reject);
}

void limit_to_lot(SamplingPlan& plan) {
  plan.whole_lot = plan.n >= plan.lot_size;
  plan.n = std::min(plan.n, plan.lot_size);
}

Result<void> plan_attributes(SamplingPlan& plan, const Sampling& sampling) {
  const auto letter = attribute_letter(plan.lot_size, sampling.level);
  if (!letter) return no_plan(fmt::format("there is no inspection level {}", sampling.level), "S-1 to S-4, I, II or III");
  const auto found = attribute_plan(plan.severity, *letter, sampling.aql_percent);
  if (!found) {
    return no_plan(fmt::format("the tables have no column for an AQL of {}", to_shortest(sampling.aql_percent)),
                   "choose one of the columns listed in docs/formats.md");
  }
  plan.code_letter = *letter;
  plan.plan_letter = found->letter;
  plan.n = found->n;
  plan.accept = found->accept;
  plan.reject = found->reject;
  limit_to_lot(plan);
  const std::string arrow = plan.code_letter == plan.plan_letter ? "" : fmt::format(" (the arrow leads to {})", plan.plan_letter);
  plan.why = fmt::format("lot of {}, level {}: code letter {}{}; AQL {}, {} inspection: {}, {}", plan.lot_size, sampling.level,
                         plan.code_letter, arrow, to_shortest(plan.aql_percent), name(plan.severity),
                         plan.whole_lot ? fmt::format("all {}", plan.n) : fmt::format("{} units", plan.n), accept_in_words(plan));
  return {};
}

Result<void> plan_variables(SamplingPlan& plan, const Sampling& sampling) {
  const auto letter = variables_letter(plan.lot_size, sampling.level);
  if (!letter) return no_plan(fmt::format("variables plans have no level {}", sampling.level), "S-3, S-4, I, II or III");
  if (plan.severity == Severity105::reduced) return no_plan("there are no reduced variables plans here", "normal or tightened");
  const bool tightened = plan.severity == Severity105::tightened;
  const auto found = variables_plan(*letter, sampling.aql_percent, tightened);
  if (!found) {
    return no_plan(fmt::format("the tables have no {} variables plan for an AQL of {}", name(plan.severity),
                               to_shortest(sampling.aql_percent)),
                   "choose another AQL, listed in docs/formats.md");
  }
  if (found->n > plan.lot_size) {
    return no_plan(fmt::format("the plan asks for {} units and the lot has {}: mean and deviation of so few say nothing", found->n,
                               plan.lot_size),
                   "inspect such a lot by attributes or whole: scheme = \"all\"");
  }
  plan.code_letter = *letter;
  plan.plan_letter = found->letter;
  plan.n = found->n;
  plan.k = found->k;
  limit_to_lot(plan);
  plan.why = fmt::format("lot of {}, level {}: code letter {}; AQL {}, {} inspection, variables of {}: {} units, k = {}", plan.lot_size,
                         sampling.level, plan.code_letter, to_shortest(plan.aql_percent), name(plan.severity), sampling.quantity,
                         plan.n, to_shortest(*plan.k));
  return {};
}

void plan_claim(SamplingPlan& plan, const Sampling& sampling) {
  plan.n = claim_size_of_lot(sampling.confidence, sampling.reliability, plan.lot_size);
  plan.whole_lot = plan.n >= plan.lot_size;
  plan.why = fmt::format("claim: with a confidence of {} at least {} of the lot of {} conform: {} units, none of them may be "
                         "nonconforming (a very large lot would need {})",
                         percent_in_words(sampling.confidence), percent_in_words(sampling.reliability), plan.lot_size, plan.n,
                         claim_size(sampling.confidence, sampling.reliability));
}

}  // namespace

Result<SamplingPlan> plan_for(const Sampling& sampling, std::uint64_t lot_size, Severity105 severity) {
  if (lot_size == 0) return no_plan("a lot of no units cannot be inspected", "give --lot-size, or a folder with captures");
  if (severity == Severity105::discontinued) {
    return no_plan("inspection under this plan is discontinued: five lots were rejected on tightened inspection",
                   "when the supplier has put it right, write resumed = <date> and severity = \"tightened\" in [sampling]");
  }
  if (severity == Severity105::reduced && !sampling.reduced_allowed) {
    return no_plan("reduced inspection is not allowed by the sheet", "write reduced = true in [sampling], or normal inspection");
  }
  SamplingPlan plan;
  plan.scheme = sampling.scheme;
  plan.lot_size = lot_size;
  plan.severity = severity;
  plan.draw_seed = sampling.seed;
  Result<void> made;
  switch (sampling.scheme) {
    case SamplingScheme::attributes:
      plan.aql_percent = sampling.aql_percent;
      made = plan_attributes(plan, sampling);
      break;
    case SamplingScheme::variables:
      plan.aql_percent = sampling.aql_percent;
      made = plan_variables(plan, sampling);
      break;
    case SamplingScheme::claim:
      plan.severity = Severity105::normal;
      plan_claim(plan, sampling);
      break;
    case SamplingScheme::all:
      plan.severity = Severity105::normal;
      plan.n = lot_size;
      plan.whole_lot = true;
      plan.accept = sampling.accept;
      plan.reject = sampling.accept + 1;
      plan.why = fmt::format("all {} units, {}", lot_size, accept_in_words(plan));
      break;
  }
  if (!made) return failure(made);
  return plan;
}

std::vector<std::uint64_t> draw_positions(std::uint64_t lot_size, std::uint64_t n, std::uint64_t seed) {
  std::vector<std::uint64_t> positions;
  if (n >= lot_size) {
    positions.resize(lot_size);
    std::iota(positions.begin(), positions.end(), std::uint64_t{1});
    return positions;
  }
  // Floyd's algorithm: every set of n positions is equally likely, in n draws.
  Random random(seed, 0x10d5);
  std::set<std::uint64_t> drawn;
  for (std::uint64_t j = lot_size - n + 1; j <= lot_size; ++j) {
    const std::uint64_t t = random.below(j) + 1;
    if (!drawn.insert(t).second) drawn.insert(j);
  }
  positions.assign(drawn.begin(), drawn.end());
  return positions;
}

std::vector<std::size_t> choose_sample(const SamplingPlan& plan, std::size_t units_present) {
  std::vector<std::size_t> chosen;
  for (const std::uint64_t position : draw_positions(units_present, std::min<std::uint64_t>(plan.n, units_present), plan.draw_seed)) {
    chosen.push_back(position - 1);
  }
  return chosen;
}

double acceptance_probability(const SamplingPlan& plan, double fraction_nonconforming, bool finite) {
  if (plan.k) return variables_acceptance(plan.n, *plan.k, fraction_nonconforming);
  // Under reduced inspection what falls between Ac and Re is accepted too.
  const std::uint64_t most = plan.reject - 1;
  if (!finite) return binomial_at_most(most, plan.n, fraction_nonconforming);
  const double bad = std::round(fraction_nonconforming * static_cast<double>(plan.lot_size));
  return hypergeometric_at_most(most, plan.n, static_cast<std::uint64_t>(bad), plan.lot_size);
}

namespace {

/// A sample of more than a tenth of the lot: drawing without putting back matters.
bool is_finite(const SamplingPlan& plan) { return !plan.k && plan.n * 10 > plan.lot_size; }

}  // namespace

std::string passes_in_words(const SamplingPlan& plan, double fraction_nonconforming) {
  const double chance = 100 * acceptance_probability(plan, fraction_nonconforming, is_finite(plan));
  const long long times = std::llround(chance);
  const std::string often = chance >= 100                 ? "always passes"
                            : chance <= 0                 ? "never passes"
                            : times >= 100                ? "passes more than 99 times in 100"
                            : times == 0                  ? "passes less than once in 100"
                            : times == 1                  ? "passes once in 100"
                                                          : fmt::format("passes {} times in 100", times);
  return fmt::format("a lot with {} bad {}", percent_in_words(fraction_nonconforming), often);
}

std::vector<OperatingPoint> operating_characteristic(const SamplingPlan& plan) {
  const bool finite = is_finite(plan);
  const auto chance = [&](double fraction) { return acceptance_probability(plan, fraction, finite); };
  double last = 1e-5;  // where hardly a lot passes any more
  while (last < 1 && chance(last) > 0.002) last *= 1.2;
  last = std::min(last, 1.0);
  constexpr int kPoints = 101;
  std::vector<OperatingPoint> points;
  if (finite) {  // only whole units can be bad
    const auto most = static_cast<std::uint64_t>(std::ceil(last * static_cast<double>(plan.lot_size)));
    const std::uint64_t step = std::max<std::uint64_t>(1, most / (kPoints - 1));
    for (std::uint64_t bad = 0; bad <= std::min(most, plan.lot_size); bad += step) {
      const double fraction = static_cast<double>(bad) / static_cast<double>(plan.lot_size);
      points.push_back({fraction, chance(fraction)});
    }
    return points;
  }
  for (int i = 0; i < kPoints; ++i) {
    const double fraction = last * i / (kPoints - 1);
    points.push_back({fraction, chance(fraction)});
  }
  return points;
}

}  // namespace coilassay

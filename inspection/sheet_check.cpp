#include "inspection/sheet_check.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/symbols.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/statistics.h"
#include "inspection/global_risk.h"
#include "inspection/rules.h"
#include "inspection/sheet_problems.h"
#include "inspection/verdict.h"
#include "inspection/words.h"

namespace coilassay {

namespace {

std::string words_of(const std::string& quantity) {
  const Symbol* symbol = find_symbol(quantity);
  return symbol != nullptr ? fmt::format("{} ({})", quantity, symbol->words) : quantity;
}

std::string tolerance_in_words(std::string_view what, const ConditionTolerance& tolerance, Unit unit) {
  return fmt::format("{} {}{}", what, tolerance.relative ? percent_in_words(tolerance.value) : stated_in_words(tolerance.value, unit),
                     tolerance.stated ? "" : " (not stated: this is taken)");
}

std::string sources_in_words(const PartSheet& sheet, const Limit& limit) {
  if (limit.test == "reading") return "from an instrument's own reading";
  std::string names;
  for (const TestPlan& test : sheet.tests) {
    if (limit_uses(limit, test)) names += (names.empty() ? "" : " or ") + test.name;
  }
  if (names.empty() && !limit.test.empty()) names = shown(limit.test, 60);
  return names.empty() ? "from whatever test of the unit gives it" : "from " + names;
}

void explain_limits(const PartSheet& sheet, std::vector<std::string>& out) {
  for (const Limit& limit : sheet.limits) {
    const std::string at = conditions_in_words(limit.at);
    out.push_back(fmt::format("{}: {}{}{}, {}.", words_of(limit.quantity), limits_in_words(limit), at.empty() ? "" : " ", at,
                              sources_in_words(sheet, limit)));
  }
  bool frequency = false, level = false, bias = false, temperature = false;
  for (const Limit& limit : sheet.limits) {
    frequency |= limit.at.frequency_hz.has_value();
    level |= limit.at.level_v || limit.at.level_a;
    bias |= limit.at.bias_a.has_value();
    temperature |= limit.at.temperature_degc.has_value();
  }
  const ConditionTolerances& t = sheet.tolerances;
  std::string parts;
  const auto add = [&](bool named, std::string words) {
    if (named) parts += (parts.empty() ? "" : ", ") + words;
  };
  add(frequency, tolerance_in_words("frequency", t.frequency, Unit::hertz));
  add(level, tolerance_in_words("level", t.level, Unit::volt));
  add(bias, tolerance_in_words("bias", t.bias, Unit::ampere));
  add(temperature, tolerance_in_words("temperature", t.temperature, Unit::kelvin));
  if (!parts.empty()) {
    out.push_back(fmt::format("Conditions may be off by: {}. Beyond that, or where nobody stated one, the unit is not comparable and does "
                              "not pass.",
                              parts));
  }
}

void explain_tests(const PartSheet& sheet, std::vector<std::string>& out) {
  for (const TestPlan& test : sheet.tests) {
    if (test.kind == "reading") continue;
    const std::size_t captures = std::max(test.repeats, test.joint_captures());
    std::string words = fmt::format("Test {}", test.name);
    if (test.kind != test.name) words += fmt::format(" ({})", test.kind);
    words += captures == 1 ? fmt::format(": one capture a unit, <serial>.{}.<ext>", test.name)
                           : fmt::format(": {} captures a unit, <serial>.{}.1.<ext> to .{}.<ext>, {}", captures, test.name, captures,
                                         test.joint_captures() > 1 ? "measured together" : "their mean is judged");
    words += test.bench ? fmt::format("; bench sheet {}.", shown(*test.bench)) : "; no bench sheet.";
    out.push_back(words);
  }
}

constexpr std::uint64_t kMostPositionsListed = 500;

/// Which units to take: nobody's hand draws at random.
std::string positions_in_words(const SamplingPlan& plan) {
  std::string list;
  for (const std::uint64_t position : draw_positions(plan.lot_size, plan.n, plan.draw_seed)) {
    list += (list.empty() ? "" : ", ") + std::to_string(position);
  }
  return fmt::format("Units to draw, counted from 1 as they lie, by seed {}: {}.", plan.draw_seed, list);
}

void explain_sampling(const PartSheet& sheet, std::optional<std::uint64_t> lot_size, SheetCheck& check) {
  const std::vector<std::uint64_t> lots = lot_size ? std::vector<std::uint64_t>{*lot_size} : std::vector<std::uint64_t>{50, 500, 5000};
  for (const std::uint64_t lot : lots) {
    const auto plan = plan_for(sheet.sampling, lot, sheet.sampling.severity);
    if (!plan) {
      check.problems.push_back({sheet.path, lot_size.has_value(), fmt::format("a lot of {}: {}", lot, plan.error().finding), plan.error().remedy});
      continue;
    }
    std::string words = "Sampling: " + plan->why + ".";
    if (plan->scheme != SamplingScheme::all) {
      for (const double bad : {0.01, 0.05, 0.10}) words += fmt::format(" {}{}", bad == 0.01 ? "With this, " : "", passes_in_words(*plan, bad)) + (bad == 0.10 ? "." : ";");
    }
    check.sentences.push_back(words);
    if (lot_size && !plan->whole_lot && plan->n <= kMostPositionsListed) check.sentences.push_back(positions_in_words(*plan));
    if (plan->scheme == SamplingScheme::all) return;  // the same for every lot
  }
  if (sheet.sampling.scheme == SamplingScheme::variables) return;
  check.sentences.push_back(sheet.sampling.undecided_set_aside
                                ? "A unit that is undecided or not comparable is set aside; where the lot could turn on it, the lot is undecided."
                                : "A unit that is undecided or not comparable counts as nonconforming.");
}

double normal_density(double x, double mean, double deviation) {
  const double z = (x - mean) / deviation;
  return std::exp(-z * z / 2) / (deviation * std::sqrt(2 * std::numbers::pi));
}

/// What the rule does to a stated process: the global risks of JCGM 106, 9.5.
void explain_processes(const PartSheet& sheet, SheetCheck& check) {
  for (const auto& [quantity, process] : sheet.processes) {
    const auto limit = std::find_if(sheet.limits.begin(), sheet.limits.end(), [&, &q = quantity](const Limit& l) { return l.quantity == q; });
    if (limit == sheet.limits.end()) {
      check.problems.push_back({sheet.path, false, fmt::format("[process.{}] is stated, and {} has no limit", quantity, quantity), "take it out"});
      continue;
    }
    const RuleOutcome outcome = apply_rule(sheet.decision, ValueLaw::normal(process.mean, process.uncertainty), limit->min, limit->max);
    const double inside = sheet.decision.rule == DecisionRule::guarded_rejection ? -outcome.guard : outcome.guard;
    const auto moved = [](std::optional<double> edge, double by) { return edge ? std::optional<double>(*edge + by) : std::nullopt; };
    const double reach = 10 * process.deviation;
    const GlobalRisks risks = global_risks([&, &p = process](double x) { return normal_density(x, p.mean, p.deviation); }, process.mean - reach,
                                           process.mean + reach, process.uncertainty, limit->min, limit->max, moved(limit->min, inside),
                                           moved(limit->max, -inside));
    const auto text = [&](double v) { return stated_in_words(v, limit->unit); };
    const auto share = [](double v) { return fmt::format("{:.3g} %", 100 * v); };
    check.sentences.push_back(fmt::format("A process of {} with mean {} and standard deviation {}, measured with a standard uncertainty of {}: of all units {} do "
                                          "not conform; {} do not conform and pass, {} conform and do not pass.",
                                          quantity, text(process.mean), text(process.deviation), text(process.uncertainty),
                                          share(risks.nonconforming), share(risks.consumer), share(risks.producer)));
  }
}

void explain_rest(const PartSheet& sheet, std::vector<std::string>& out) {
  out.push_back(fmt::format("Retests: {} of a unit may count; {}.",
                            sheet.retest.attempts == 1 ? "one attempt" : fmt::format("{} attempts", sheet.retest.attempts),
                            sheet.retest.use == RetestUse::first ? "the first one that gives a result stands" : "their mean is judged"));
  for (const auto& [symbol, sigma] : sheet.gauge_sigma) {
    const Symbol* known = find_symbol(symbol);
    out.push_back(fmt::format("Placing and reading add a standard deviation of {} to {}.",
                              stated_in_words(sigma, known != nullptr ? known->unit : Unit::one), symbol));
  }
  if (sheet.check_standard) {
    const CheckStandard& c = *sheet.check_standard;
    out.push_back(fmt::format("Check standard {}: {} every {:.4g} h, {}; when it is out or overdue, lots are {}.", shown(c.serial, 60),
                              c.quantity, c.every_s / 3600,
                              c.centre ? fmt::format("within {} ± 3 x {}", stated_in_words(*c.centre, c.unit), stated_in_words(*c.sigma, c.unit))
                                       : fmt::format("limits from its first {} readings", c.baseline),
                              c.refuse ? "refused" : "marked"));
  }
}

}  // namespace

bool SheetCheck::usable() const {
  return std::none_of(problems.begin(), problems.end(), [](const SheetProblem& p) { return p.contradiction; });
}

SheetCheck check_sheet(const PartSheet& sheet, std::optional<std::uint64_t> lot_size) {
  SheetCheck check;
  check.path = sheet.path;
  check.sha256 = sheet.sha256;
  check.part = sheet.name;
  check.revision = sheet.revision;
  std::string head = shown(sheet.name);
  if (!sheet.revision.empty()) head += ", revision " + shown(sheet.revision);
  if (!sheet.supplier.empty()) head += ", from " + shown(sheet.supplier);
  check.sentences.push_back(head + ".");
  explain_limits(sheet, check.sentences);
  explain_tests(sheet, check.sentences);
  std::string rule = rule_in_words(sheet.decision);
  check.sentences.push_back("Rule: " + rule + ".");
  explain_processes(sheet, check);
  explain_sampling(sheet, lot_size, check);
  explain_rest(sheet, check.sentences);
  std::vector<SheetProblem> problems = sheet_problems(sheet);
  check.problems.insert(check.problems.begin(), problems.begin(), problems.end());
  return check;
}

}  // namespace coilassay

#include "inspection/gauge_study.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cassert>
#include <cmath>
#include <limits>
#include <map>
#include <numbers>

#include "base/outside_text.h"
#include "base/random.h"

namespace coilassay {

namespace {

constexpr double kGood = 0.10, kConditional = 0.30;   // %GRR, as commonly judged (AIAG MSA, 4th edition, from memory)
constexpr std::uint64_t kEnoughCategories = 5;
constexpr double kStudyWidth = 6;                     // standard deviations a tolerance is compared with

enum Which : std::size_t { kRepeatability, kOperator, kInteraction, kReproducibility, kGauge, kPart, kTotal, kComponents };
constexpr std::array<const char*, kComponents> kNames = {"repeatability", "operator", "interaction", "reproducibility",
                                                         "gauge",         "part",     "total"};

struct MeanSquares {
  double part = 0, oper = 0, interaction = 0, within = 0;
};

/// Variances by their expected mean squares; negative ones are none.
std::array<double, kComponents> variances_of(const MeanSquares& ms, double parts, double operators, double trials, bool pooled) {
  const auto positive = [](double v) { return std::max(v, 0.0); };
  std::array<double, kComponents> v{};
  v[kRepeatability] = ms.within;
  const double yardstick = pooled || operators < 2 ? ms.within : ms.interaction;
  v[kInteraction] = pooled || operators < 2 ? 0 : positive((ms.interaction - ms.within) / trials);
  v[kOperator] = operators < 2 ? 0 : positive((ms.oper - yardstick) / (parts * trials));
  v[kPart] = positive((ms.part - yardstick) / (operators * trials));
  v[kReproducibility] = v[kOperator] + v[kInteraction];
  v[kGauge] = v[kRepeatability] + v[kReproducibility];
  v[kTotal] = v[kGauge] + v[kPart];
  return v;
}

/// Gamma law of shape a >= 1/2 and scale 1 (Marsaglia and Tsang 2000; the boost for a < 1 included).
double gamma_draw(Random& random, double a) {
  if (a < 1) return gamma_draw(random, a + 1) * std::pow(1 - random.uniform(), 1 / a);
  const double d = a - 1.0 / 3, c = 1 / std::sqrt(9 * d);
  while (true) {
    const double x = random.normal(), v = std::pow(1 + c * x, 3);
    if (v > 0 && std::log(1 - random.uniform()) < x * x / 2 + d * (1 - v + std::log(v))) return d * v;
  }
}

/// A mean square as it might have been meant: MS dof / chi-square.
double meant(Random& random, const VarianceLine& line) {
  return line.dof > 0 ? line.sum_of_squares / (2 * gamma_draw(random, line.dof / 2)) : 0;
}

std::pair<double, double> middle_95(std::vector<double>& draws) {
  const auto at = [&](double fraction) {
    const auto position = static_cast<std::ptrdiff_t>(fraction * static_cast<double>(draws.size() - 1));
    std::nth_element(draws.begin(), draws.begin() + position, draws.end());
    return draws[static_cast<std::size_t>(position)];
  };
  const double low = at(0.025);
  return {low, at(0.975)};
}

/// Names in the order of their first appearance, and where each stands.
struct Names {
  std::vector<std::string> list;
  std::map<std::string, std::size_t> at;
};

Names names_of(std::span<const GaugeReading> readings, std::string GaugeReading::*member) {
  Names names;
  for (const GaugeReading& reading : readings) {
    if (names.at.try_emplace(reading.*member, names.list.size()).second) names.list.push_back(reading.*member);
  }
  return names;
}

std::string cell_in_words(const std::string& part, const std::string& oper, const std::string& trial) {
  return fmt::format("part {}, operator {}, trial {}", shown(part, 40), shown(oper, 40), shown(trial, 40));
}

/// Readings into the table of the study; every cell once.
Result<void> arrange(std::span<const GaugeReading> readings, GaugeStudy& study) {
  const Names parts = names_of(readings, &GaugeReading::part), operators = names_of(readings, &GaugeReading::operator_name),
              trials = names_of(readings, &GaugeReading::trial);
  study.parts = parts.list;
  study.operators = operators.list;
  study.trials = trials.list;
  const std::size_t o = study.operators.size(), r = study.trials.size();
  if (study.parts.size() < 2) {
    return failure(Problem::too_few_samples, "gauge study", "there is only one part: how parts differ cannot be told",
                   "read at least two parts, ten are usual");
  }
  if (r < 2) {
    return failure(Problem::too_few_samples, "gauge study", "each part was read once: how readings repeat cannot be told",
                   "let every operator place and read each part at least twice");
  }
  // Names that hardly repeat (a trial numbered through, say) would ask for a table of all their combinations.
  const double cells = static_cast<double>(study.parts.size()) * static_cast<double>(o) * static_cast<double>(r);
  if (cells > 20 * static_cast<double>(readings.size())) {
    return failure(Problem::damaged, "gauge study",
                   fmt::format("{} parts, {} operators and {} trials are named, and there are only {} readings", study.parts.size(), o, r,
                               readings.size()),
                   "trials count anew for every part and operator: 1, 2, 3");
  }
  study.values.assign(study.parts.size() * o * r, std::numeric_limits<double>::quiet_NaN());
  for (const GaugeReading& reading : readings) {
    const std::string words = cell_in_words(reading.part, reading.operator_name, reading.trial);
    if (!std::isfinite(reading.value)) {
      return failure(Problem::damaged, "gauge study", words + " has no value", "read it again; a crossed study needs every reading");
    }
    double& cell = study.values[(parts.at.at(reading.part) * o + operators.at.at(reading.operator_name)) * r + trials.at.at(reading.trial)];
    if (!std::isnan(cell)) return failure(Problem::damaged, "gauge study", words + " is there twice", "leave one of them out");
    cell = reading.value;
  }
  for (std::size_t c = 0; c < study.values.size(); ++c) {
    if (std::isnan(study.values[c])) {
      return failure(Problem::damaged, "gauge study",
                     cell_in_words(study.parts[c / (o * r)], study.operators[c / r % o], study.trials[c % r]) + " is missing",
                     "a crossed study needs every part read by every operator in every trial: read it, or leave that part out");
    }
  }
  return {};
}

void judge(GaugeStudy& study) {
  const WithInterval& interval = study.grr_of_tolerance ? *study.grr_of_tolerance : study.grr_of_study;
  const double grr = interval.value;
  const std::string base = study.grr_of_tolerance ? "of the tolerance" : "of the study's variation";
  const auto verdict = [&](bool good, bool conditional) { return good ? "good" : conditional ? "conditional" : "poor"; };
  study.judgement = verdict(grr < kGood, grr <= kConditional);
  study.why.push_back(fmt::format("%GRR is {:.1f} % {}: below 10 % is good, up to 30 % conditional", 100 * grr, base));
  const auto grade = [&](double ratio) { return std::string(verdict(ratio < kGood, ratio <= kConditional)); };
  if (const std::string best = grade(interval.low), worst = grade(interval.high); best != worst) {
    study.why.push_back(fmt::format("Its interval, {:.1f} % to {:.1f} %, reaches from {} to {}: more parts, and above all more operators, would tell",
                                    100 * interval.low, 100 * interval.high, best, worst));
  }
  if (study.ndc < kEnoughCategories) {
    // Against a tolerance parts need not differ; for telling them apart they must.
    if (!study.grr_of_tolerance) study.judgement = "poor";
    study.why.push_back(fmt::format("The readings tell {} categories of these parts apart, where 5 are asked for", study.ndc));
  } else {
    study.why.push_back(fmt::format("The readings tell {} categories of these parts apart", study.ndc));
  }
}

}  // namespace

const GaugeComponent& GaugeStudy::component(std::string_view name) const {
  const auto found = std::find_if(components.begin(), components.end(), [&](const GaugeComponent& c) { return c.name == name; });
  assert(found != components.end());
  return *found;
}

Result<GaugeStudy> study_gauge(std::span<const GaugeReading> readings, const GaugeOptions& options) {
  GaugeStudy study;
  if (const auto arranged = arrange(readings, study); !arranged) return failure(arranged);
  const double p = static_cast<double>(study.parts.size()), o = static_cast<double>(study.operators.size()),
               r = static_cast<double>(study.trials.size());
  study.table = analyse_two_way(study.values, study.parts.size(), study.operators.size(), study.trials.size());
  if (!(study.table.within.sum_of_squares > 0)) {
    return failure(Problem::no_signal, "gauge study", "every part gave the same reading in every trial: the last digit hides how readings repeat",
                   "read with a finer last digit");
  }
  VarianceLine within = study.table.within;
  study.pooled = study.operators.size() > 1 && study.table.interaction.p > options.pooling_probability;
  if (study.pooled) {
    within.dof += study.table.interaction.dof;
    within.sum_of_squares += study.table.interaction.sum_of_squares;
    within.mean_square = within.sum_of_squares / within.dof;
    study.pooled_within = within;
  }
  const TwoWayAnalysis& t = study.table;
  const auto variances = variances_of({t.first.mean_square, t.second.mean_square, t.interaction.mean_square, within.mean_square}, p, o, r,
                                      study.pooled);
  std::array<std::vector<double>, kComponents> draws;
  std::vector<double> grr, categories;
  Random random(options.seed, 0x6a5e);
  for (std::uint64_t i = 0; i < options.draws; ++i) {
    const MeanSquares ms{meant(random, t.first), meant(random, t.second), meant(random, t.interaction), meant(random, within)};
    const auto v = variances_of(ms, p, o, r, study.pooled);
    for (std::size_t c = 0; c < kComponents; ++c) draws[c].push_back(v[c]);
    grr.push_back(std::sqrt(v[kGauge] / v[kTotal]));
    categories.push_back(std::numbers::sqrt2 * std::sqrt(v[kPart] / v[kGauge]));
  }
  for (std::size_t c = 0; c < kComponents; ++c) {
    const auto [low, high] = middle_95(draws[c]);
    study.components.push_back({kNames[c], std::sqrt(variances[c]), std::sqrt(low), std::sqrt(high), variances[c] / variances[kTotal]});
  }
  const auto with_interval = [](double value, std::vector<double>& drawn) {
    const auto [low, high] = middle_95(drawn);
    return WithInterval{value, low, high};
  };
  study.grr_of_study = with_interval(std::sqrt(variances[kGauge] / variances[kTotal]), grr);
  study.categories = with_interval(std::numbers::sqrt2 * std::sqrt(variances[kPart] / variances[kGauge]), categories);
  study.ndc = static_cast<std::uint64_t>(study.categories.value);
  if (options.tolerance && *options.tolerance > 0) {
    const GaugeComponent& gauge = study.component("gauge");
    const double scale = kStudyWidth / *options.tolerance;
    study.grr_of_tolerance = WithInterval{scale * gauge.sigma, scale * gauge.low, scale * gauge.high};
  }
  judge(study);
  return study;
}

}  // namespace coilassay

// Claim: verdicts carry the risk they state.
//
//   (a) Units exactly on a limit, measured with errors of their stated law, pass with the stated risk: one limit and two, four
//       widths, normal, rectangular and Student's t errors. With two limits the expected share is that of the exact guard band, by
//       quadrature.
//   (b) The printed probability of conforming is calibrated: of units given p between 60 and 70 %, that share conforms; likewise
//       for every tenth. Units come from a process that is flat over the interval, as the probability assumes.
//   (c) For a stated process both global risks equal the quadrature of JCGM 106, 9.5: gamma process of 9.5.4, and a normal
//       one with two limits, by all four rules.
// Each within four standard deviations of a binomial. Exit 1 when one is missed. Argument: units per case (default 100000).
#include <array>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <functional>
#include <string>

#include "base/random.h"
#include "inspection/global_risk.h"
#include "inspection/value_law.h"
#include "inspection/verdict.h"

namespace {

using namespace coilassay;

constexpr double kNormalFactor = 1.959963984540054;
bool all_met = true;

void claim(const std::string& what, double counted, double expected, double units) {
  const double limit = 4 * std::sqrt(std::max(expected * (1 - expected), 1 / units) / units);
  const bool met = std::fabs(counted - expected) <= limit;
  std::printf("%-68s %.5f, expected %.5f +- %.5f  %s\n", what.c_str(), counted, expected, limit, met ? "met" : "MISSED");
  all_met = all_met && met;
}

PartSheet sheet_of(const char* rule, std::optional<double> min, std::optional<double> max) {
  PartSheet sheet;
  Limit limit;
  limit.quantity = "L_s";
  limit.unit = Unit::henry;
  limit.min = min;
  limit.max = max;
  sheet.limits.push_back(limit);
  for (const DecisionRule each : {DecisionRule::simple, DecisionRule::guarded_acceptance, DecisionRule::guarded, DecisionRule::guarded_rejection}) {
    if (name(each) == rule) sheet.decision.rule = each;
  }
  return sheet;
}

/// A law of errors of standard uncertainty 1: how it is drawn, and the factor of its 95 % interval.
struct ErrorKind {
  const char* name;
  double factor;
  double (*draw)(Random&);
};
constexpr ErrorKind kKinds[] = {
    {"normal", kNormalFactor, [](Random& r) { return r.normal(); }},
    {"rectangular", 1.6454482671904334, [](Random& r) { return r.uniform(-1.7320508075688772, 1.7320508075688772); }},
    {"t of 5", 2.5705818366147395, [](Random& r) { return r.student_t(5); }}};

LimitVerdict judged(const PartSheet& sheet, double value, double u, double factor) {
  TestedUnit unit;
  unit.test = unit.measurement.test = "ringdown";
  Estimate e;
  e.symbol = "L_s";
  e.quantity = {value, u, Unit::henry};
  e.k = factor;
  e.low = value - factor * u;
  e.high = value + factor * u;
  unit.measurement.estimates.push_back(e);
  return judge_limit(sheet.limits[0], sheet, std::array{unit});
}

void units_on_a_limit(int units) {
  for (const ErrorKind& kind : kKinds) {
    for (const double width : {0.0, 4.0, 6.0, 40.0}) {   // 0: one limit
      const PartSheet sheet = sheet_of("guarded", 0.0, width > 0 ? std::optional<double>(width) : std::nullopt);
      Random random(static_cast<std::uint64_t>(width) + 3, 1);
      int passed = 0;
      double guard = 0;
      for (int i = 0; i < units; ++i) {
        const LimitVerdict v = judged(sheet, kind.draw(random), 1, kind.factor);
        passed += v.verdict == Verdict::pass;
        guard = *v.guard;
      }
      // A unit on the lower limit passes when its error lies between g and width - g; the laws' own tails, drawn apart.
      const ValueLaw law = *ValueLaw::of([&] {
        Estimate e;
        e.quantity = {0, 1, Unit::henry};
        e.low = -kind.factor;
        e.high = kind.factor;
        return e;
      }());
      const double expected = std::max(law.above(guard) - (width > 0 ? law.above(width - guard) : 0), 0.0);   // 0: no room
      claim(std::string("on a limit, ") + kind.name + (width > 0 ? ", two limits " + std::to_string(int(width)) + " u apart" : ", one limit"),
            passed / double(units), expected, units);
      if (width == 0 || width == 40) claim("  the stated risk", passed / double(units), 0.05, units);
    }
  }
}

void calibration(int units) {
  for (const ErrorKind& kind : kKinds) {
    const PartSheet sheet = sheet_of("guarded", 0.0, 5.0);
    Random random(17, 2);
    std::array<double, 10> given{}, conforming{}, count{};
    for (int i = 0; i < units; ++i) {
      const double truth = random.uniform(-13, 18);   // flat beyond the reach of the values looked at
      const double value = truth + kind.draw(random);
      if (value < -4 || value > 9) continue;
      const double p = *judged(sheet, value, 1, kind.factor).p_conform;
      const auto tenth = static_cast<std::size_t>(std::min(p * 10, 9.0));
      count[tenth] += 1;
      given[tenth] += p;
      conforming[tenth] += truth >= 0 && truth <= 5;
    }
    for (std::size_t t = 0; t < 10; ++t) {
      if (count[t] < 100) continue;
      claim(std::string("given ") + std::to_string(10 * t) + " to " + std::to_string(10 * t + 10) + " %, " + kind.name, conforming[t] / count[t],
            given[t] / count[t], count[t]);
    }
  }
}

struct Process {
  const char* name;
  std::function<double(Random&)> draw;
  std::function<double(double)> density;
  double from, to, u;
  std::optional<double> min, max;
};

void global(int units) {
  const Process processes[] = {
      {"gamma process of 9.5.4", [](Random& r) {
         double sum = 0;   // gamma of shape 4: four exponential times
         for (int i = 0; i < 4; ++i) sum -= 0.25 * std::log(1 - r.uniform());
         return sum;
       },
       [](double x) { return x > 0 ? std::pow(x, 3) * std::exp(-x / 0.25) / (6 * std::pow(0.25, 4)) : 0; }, 0, 8, 0.25, std::nullopt, 2.0},
      {"normal process, two limits", [](Random& r) { return 1500 + 0.12 * r.normal(); },
       [](double x) { return std::exp(-std::pow((x - 1500) / 0.12, 2) / 2) / (0.12 * std::sqrt(2 * M_PI)); }, 1499, 1501, 0.04, 1499.8, 1500.2}};
  for (const Process& process : processes) {
    for (const char* rule : {"simple", "guarded_acceptance", "guarded", "guarded_rejection"}) {
      const PartSheet sheet = sheet_of(rule, process.min, process.max);
      Random random(29, 3);
      double wrong_pass = 0, wrong_no_pass = 0;
      for (int i = 0; i < units; ++i) {
        const double truth = process.draw(random);
        const LimitVerdict v = judged(sheet, truth + process.u * random.normal(), process.u, kNormalFactor);
        const bool good = (!process.min || truth >= *process.min) && (!process.max || truth <= *process.max), pass = v.verdict == Verdict::pass;
        wrong_pass += !good && pass;
        wrong_no_pass += good && !pass;
      }
      // z of 5 % by any table; with limits 10 u apart the second one does not matter to four digits.
      const std::string word(rule);
      const double shift = word == "simple" ? 0 : (word == "guarded_rejection" ? -1 : 1) * 1.6448536269514722 * process.u;
      const auto in = [&](std::optional<double> limit, double by) { return limit ? std::optional<double>(*limit + by) : std::nullopt; };
      const GlobalRisks risks = global_risks(process.density, process.from, process.to, process.u, process.min, process.max,
                                             in(process.min, shift), in(process.max, -shift));
      claim(std::string(process.name) + ", " + rule + ": consumer", wrong_pass / units, risks.consumer, units);
      claim(std::string(process.name) + ", " + rule + ": producer", wrong_no_pass / units, risks.producer, units);
    }
  }
}

}  // namespace

int main(int argc, char** argv) {
  const int units = argc > 1 ? std::atoi(argv[1]) : 100000;
  units_on_a_limit(units);
  calibration(units);
  global(units);
  std::printf(all_met ? "all claims met\n" : "A CLAIM IS MISSED\n");
  return all_met ? 0 : 1;
}

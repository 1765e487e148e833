#include "fitting/kramers_kronig.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "fitting/circuit_equations.h"
#include "fitting/circuit_outliers.h"
#include "fitting/kramers_kronig_equations.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kFalseAlarms = 1.0 / 2000;
constexpr std::size_t kFewestPoints = 12;
constexpr double kMu = 0.85;                  // Schoenleber's limit
constexpr std::array<std::size_t, 9> kElements = {1, 2, 3, 5, 7, 10, 14, 20, 28};
constexpr std::size_t kMostRounds = 40;
constexpr std::size_t kManyPoints = 1000;
constexpr std::size_t kRow = 2;                // points off together that may be a resonance
constexpr std::size_t kMostResonances = 4;
constexpr double kPlainGain = 20;              // of chi-square
constexpr double kLeftOver = 0.1;              // of the circuit's misfit
constexpr double kLeastError = 1e-5;            // of ln z or S: less is no finding
constexpr double kLeastRest = 0.02;           // variance a residual must keep to say anything

/// More elements while chi-square falls by more than ln n for each, and while mu leaves room.
CausalSolution grown(CausalEquations& equations, const std::vector<bool>& used, bool scale_known) {
  const double n = 2 * static_cast<double>(equations.size());
  CausalSolution best;
  double least = HUGE_VAL;
  for (const std::size_t elements : kElements) {
    const bool many = static_cast<double>(elements + static_cast<std::size_t>(equations.fixed_columns())) > n / 3;
    if (elements > kElements.front() && many) break;
    const CausalSolution next = solve_causal(equations, used, elements);
    const double cost = (scale_known ? next.chi : n * std::log(std::fmax(next.chi, 1e-300))) + static_cast<double>(elements) * std::log(n);
    if (elements == kElements.front() || cost < least || (next.mu > kMu && best.elements < 3)) {
      least = std::fmin(cost, least);
      best = next;
    } else if (elements > 3 * best.elements + 4) {
      break;
    }
  }
  // A narrow resonance bends within its own uncertainty: follow it.
  for (int round = 0; round < 2; ++round) {
    const Circuit before = equations.about();
    equations.move(best.coefficients);
    const CausalSolution next = solve_causal(equations, used, best.elements);
    if (!(next.chi <= best.chi * (1 + 1e-6))) {   // further than its slopes hold
      equations.move_to(before);
      break;
    }
    best = next;
  }
  return best;
}

/// Residuals of the points used, each of unit variance where the errors have it.
std::vector<Complex> even_residuals(const CausalSolution& s, const std::vector<bool>& used) {
  std::vector<Complex> list;
  for (std::size_t i = 0; i < used.size(); ++i) {
    if (!used[i]) continue;
    const Eigen::Index r = CausalEquations::row(i);
    const double real = std::sqrt(std::fmax(s.rest[i](0, 0), kLeastRest)), imaginary = std::sqrt(std::fmax(s.rest[i](1, 1), kLeastRest));
    list.emplace_back(s.residual[r] / real, s.residual[r + 1] / imaginary);
  }
  return list;
}

/// Squared residual of each point in units of its own covariance and of sigma^2.
double surprise(const CausalSolution& s, std::size_t i, double sigma) {
  const Eigen::Vector2d r = s.residual.segment<2>(CausalEquations::row(i));
  // Eigenvalues of the covariance: a direction in which the point all but determines itself says nothing.
  const double a = s.rest[i](0, 0), b = s.rest[i](0, 1), c = s.rest[i](1, 1);
  const double middle = (a + c) / 2, half = std::hypot((a - c) / 2, b);
  const double angle = 0.5 * std::atan2(2 * b, a - c);
  const double along = std::cos(angle) * r[0] + std::sin(angle) * r[1], across = std::cos(angle) * r[1] - std::sin(angle) * r[0];
  double sum = 0;
  if (middle + half > kLeastRest) sum += along * along / (middle + half);
  if (middle - half > kLeastRest) sum += across * across / (middle - half);
  return sum / (sigma * sigma);
}

/// Probability of residuals of neighbours so alike by chance.
double likeness_probability(const std::vector<Complex>& residuals) {
  std::vector<double> real, imaginary;
  for (const Complex& r : residuals) {
    real.push_back(r.real());
    imaginary.push_back(r.imag());
  }
  const double n = static_cast<double>(real.size());
  return 1 - normal_cdf((lag_one_correlation(real) + lag_one_correlation(imaginary)) * std::sqrt(n / 2));
}

struct Judged {
  CausalSolution solved;
  double sigma = 1;       // of the errors
  double spread = 1;      // of the errors and of what a limited number of elements leaves
};

/// Takes out points that lie off, the worst first, until none does.
Judged judge(CausalEquations& equations, std::vector<bool>& used, bool scale_known, double left_over) {
  Judged now;
  const double limit = worst_by_chance(used.size(), kFalseAlarms, scale_known);
  // Each round takes out what is more than a third of the worst: eight reach over four decades, and a long sweep's cost time.
  const std::size_t rounds = used.size() > kManyPoints ? 8 : kMostRounds;
  for (std::size_t round = 0; round < rounds; ++round) {
    now.solved = grown(equations, used, scale_known);
    if (!scale_known) now.sigma = neighbour_noise(even_residuals(now.solved, used));
    if (!(now.sigma >= 0)) break;
    now.spread = std::hypot(now.sigma, left_over);
    if (!(now.spread > 0)) break;
    std::vector<double> off(used.size(), 0);   // of points not used, and of those that only differ in the last digits of a file: 0
    double worst = limit;
    for (std::size_t i = 0; i < used.size(); ++i) {
      const Eigen::Index r = CausalEquations::row(i);
      if (!used[i] || std::abs(equations.unwhitened(i, {now.solved.residual[r], now.solved.residual[r + 1]})) < kLeastError) continue;
      off[i] = surprise(now.solved, i, now.spread);
      worst = std::fmax(worst, off[i]);
    }
    std::size_t removed = 0;
    for (std::size_t i = 0; i < used.size(); ++i) {
      // Those much like the worst go with it; lesser ones may only be in its shadow.
      if (off[i] > std::fmax(limit, 0.3 * worst)) used[i] = false, ++removed;
    }
    const auto left = static_cast<std::size_t>(std::count(used.begin(), used.end(), true));
    // A sweep of which most points are off is condemned; going on would only cost time.
    if (removed == 0 || left < kFewestPoints || 2 * left < used.size()) break;
  }
  return now;
}

/// The longest row of neighbours taken out, with gaps of one: [first, end).
std::pair<std::size_t, std::size_t> longest_row(const std::vector<bool>& used) {
  std::pair<std::size_t, std::size_t> best{0, 0};
  for (std::size_t a = 0; a < used.size(); ++a) {
    if (used[a]) continue;
    std::size_t b = a + 1, out = 1;
    for (std::size_t k = b; k < used.size() && k < b + 2; ++k) {
      if (!used[k]) b = k + 1, ++out;
    }
    if (out >= kRow && b - a > best.second - best.first) best = {a, b};
    a = b;
  }
  return best;
}

/// Adds the resonance that helps most near a row of points, when it helps far more than chance. Its width is never less than two
/// steps of the sweep: a single point is not explained by it.
bool add_resonance(CausalEquations& equations, const std::vector<bool>& used, std::pair<std::size_t, std::size_t> row, const Judged& now) {
  const double before = solve_causal(equations, used, now.solved.elements).chi;
  const double spacing = equations.spacing((row.first + row.second) / 2), narrowest = 2 * spacing;
  double least = HUGE_VAL;
  CausalResonance best;
  const auto look = [&](const CausalResonance& trial) {
    equations.add_resonance(trial);
    const double chi = solve_causal(equations, used, now.solved.elements).chi;
    equations.drop_resonance();
    if (!(chi < least)) return false;
    least = chi;
    best = trial;
    return true;
  };
  for (std::size_t i = row.first; i < row.second; i += std::max<std::size_t>(1, (row.second - row.first) / 4)) {
    for (const double damping : {narrowest, 3 * narrowest, 10 * narrowest}) look({equations.omega(i), damping});
  }
  for (double step = 1; step > 0.02;) {
    const CausalResonance from = best;
    bool better = false;
    for (const double side : {-1.0, 1.0}) {
      better = look({from.omega * std::exp(side * step * spacing), from.damping}) || better;
      better = look({from.omega, std::fmax(from.damping * std::exp(side * step), narrowest)}) || better;
    }
    if (!better) step *= 0.4;
  }
  const double n = 2 * static_cast<double>(used.size());
  if (before - least < (4 * std::log(n) + kPlainGain) * now.spread * now.spread) return false;
  equations.add_resonance(best);
  return true;
}

}  // namespace

Result<KramersKronig> test_kramers_kronig(const CircuitData& data, const std::optional<Circuit>& about) {
  const auto points = usable_points(data);
  bool phase = data.errors == SweepErrors::reflection || data.u_phase.empty();
  for (const double u : data.u_phase) phase = phase || std::isfinite(u);
  if (points.size() < kFewestPoints || !phase) {
    return failure(Problem::too_few_samples, "causality test",
                   phase ? std::to_string(points.size()) + " usable points" : "no phase was measured",
                   "the test needs modulus and phase at 12 frequencies or more");
  }
  std::optional<Circuit> circuit = about;
  if (!circuit) {
    auto choice = choose_circuit(data);
    if (!choice) return failure(choice);
    circuit = choice->best.circuit;
  }
  CausalEquations equations(data, points, *circuit);
  std::vector<bool> used(points.size(), true);
  KramersKronig result;
  // The chain follows what the circuit misses only so well: errors far below the circuit's own are not its matter.
  std::vector<double> missed;
  for (std::size_t i = 0; i < points.size(); ++i) missed.push_back(equations.y().segment<2>(CausalEquations::row(i)).norm());
  const double left_over = kLeftOver * median(missed) + equations.rounding();
  Judged judged = judge(equations, used, data.scale_known, left_over);
  // Several neighbours off together may be a resonance that the circuit lacks, and causal all the same.
  const std::size_t resonances = points.size() > kManyPoints ? 1 : kMostResonances;
  for (std::size_t k = 0; k < resonances; ++k) {
    const auto row = longest_row(used);
    if (row.second == row.first || 4 * (row.second - row.first) > used.size()) break;
    for (std::size_t i = row.first; i < row.second; ++i) used[i] = true;
    const bool added = add_resonance(equations, used, row, judged);
    judged = judge(equations, used, data.scale_known, left_over);
    if (!added) break;
  }
  const CausalSolution& solved = judged.solved;
  const double sigma = judged.sigma;
  for (std::size_t i = 0; i < points.size(); ++i) {
    const Eigen::Index r = CausalEquations::row(i);
    result.frequency_hz.push_back(equations.frequency_hz(i));
    result.index.push_back(points[i]);
    result.residual.push_back(equations.unwhitened(i, {solved.residual[r], solved.residual[r + 1]}));
    const Complex one = equations.unwhitened(i, {sigma, sigma});
    result.predicted_u.push_back(std::abs(one) / std::sqrt(2.0));
    if (!used[i]) result.not_causal.push_back(points[i]);
  }
  std::sort(result.not_causal.begin(), result.not_causal.end());
  result.elements = solved.elements;
  result.mu = solved.mu;
  result.chi_square = solved.chi;
  result.dof = solved.dof;
  result.scale = sigma;
  // Likeness of neighbours says something where the residuals are more than what the chain leaves.
  const bool told = solved.chi > 4 * solved.dof * left_over * left_over;
  result.probability = told ? likeness_probability(even_residuals(solved, used)) : 1;
  if (data.scale_known) result.probability = std::fmin(1, 2 * std::fmin(result.probability, f_upper_tail(solved.chi / solved.dof, solved.dof, HUGE_VAL)));
  result.passed = result.not_causal.empty() && result.probability >= kFalseAlarms;
  return result;
}

}  // namespace coilassay

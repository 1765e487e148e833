#include <algorithm>
#include <cmath>
#include <numeric>
#include <functional>

#include "fitting/circuit_equations.h"
#include "fitting/circuit_fit.h"
#include "fitting/circuit_outliers.h"
#include "fitting/circuit_start.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr double kFalseAlarms = 1e-3;      // sweeps that lose a point by chance
constexpr std::size_t kMostRounds = 5;
constexpr double kMostLeftOut = 0.2;       // share of the points: with more it is not single points that are wrong
constexpr double kLeastError = 1e-5;       // of ln z or S
constexpr double kFarOff = 0.7;            // of ln |z|: some five times this, a factor of 50, is far
constexpr std::size_t kFewPoints = 51;
constexpr std::size_t kSinglePoints = 3;   // as many neighbours may be wrong together; more are a feature of the curve

bool holds(const CircuitFamily& large, const CircuitFamily& small) {
  return (large.parallel_loss || !small.parallel_loss) && (large.skin || !small.skin) && (large.relaxation || !small.relaxation) &&
         (large.second_resonance || !small.second_resonance) && large != small;
}

/// Simple ones first, so that larger ones can begin where smaller ones ended.
std::vector<CircuitFamily> usual_families() {
  std::vector<CircuitFamily> list;
  for (const bool loss : {false, true}) {
    for (const int law : {0, 1, 2}) {
      CircuitFamily family;
      family.parallel_loss = loss;
      family.skin = law == 1;
      family.relaxation = law == 2;
      list.push_back(family);
    }
  }
  return list;
}

struct Tried {
  std::vector<CircuitFit> fits;
  std::vector<CircuitCandidate> candidates;   // same order
  std::size_t best = 0, second = 0;           // indices by criterion; equal when there is only one
};

double criterion_of(const CircuitData& data, const CircuitFit& fit) {
  const double p = static_cast<double>(fit.order.size()), n = fit.dof + p;
  const double misfit = data.scale_known ? fit.chi_square : n * std::log(std::fmax(fit.chi_square, 1e-300));
  return misfit + p * std::log(n);
}

void rank(Tried& tried) {
  std::vector<std::size_t> order(tried.fits.size());
  for (std::size_t i = 0; i < order.size(); ++i) order[i] = i;
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
    return tried.candidates[a].criterion < tried.candidates[b].criterion;
  });
  tried.best = order.front();
  tried.second = order.size() > 1 ? order[1] : order[0];
}

CircuitFitOptions options_of(const CircuitChoiceOptions& options) {
  CircuitFitOptions one;
  one.reference_hz = options.reference_hz;
  one.limits = false;
  one.quick = true;
  return one;
}

/// Fits a family from the data, and again from the best smaller one when it ends above that.
Result<CircuitFit> fit_family(const CircuitData& data, const CircuitFamily& family, const CircuitChoiceOptions& options,
                              const Tried& tried) {
  Result<CircuitFit> fit = fit_circuit(data, family, options_of(options));
  const CircuitFit* inside = nullptr;
  for (const CircuitFit& other : tried.fits) {
    if (holds(family, other.circuit.family) && (inside == nullptr || other.chi_square < inside->chi_square)) inside = &other;
  }
  if (inside == nullptr || (fit && fit->chi_square <= inside->chi_square)) return fit;
  const CircuitEquations few(data, thin_points(usable_points(data), kFewPoints), true);
  CircuitFitOptions from = options_of(options);
  from.start = extend_circuit(few, inside->circuit, family);
  Result<CircuitFit> again = fit_circuit(data, family, from);
  if (again && (!fit || again->chi_square < fit->chi_square)) return again;
  return fit;
}

void add(const CircuitData& data, CircuitFit fit, Tried& tried) {
  tried.candidates.push_back({fit.circuit.family, criterion_of(data, fit), fit.chi_square, fit.dof});
  tried.fits.push_back(std::move(fit));
}

/// Residuals in the order of frequency.
std::vector<std::complex<double>> in_order(const CircuitData& data, const CircuitFit& fit) {
  std::vector<std::complex<double>> list;
  for (const std::size_t i : usable_points(data)) list.push_back(fit.residual[i]);
  return list;
}

/// Neighbouring residuals alike beyond chance (1 in 1000), or chi-square so.
bool shows_structure(const CircuitData& data, const CircuitFit& fit) {
  std::vector<double> real, imaginary;
  for (const auto& r : in_order(data, fit)) {
    real.push_back(r.real());
    imaginary.push_back(r.imag());
  }
  const double n = static_cast<double>(real.size());
  const double together = fit.phase_used ? (lag_one_correlation(real) + lag_one_correlation(imaginary)) * std::sqrt(n / 2)
                                         : lag_one_correlation(real) * std::sqrt(n);
  return together > 3.1 || (data.scale_known && fit.chi_square > chi_square_quantile(0.999, fit.dof));
}

/// Residuals of a fit that single points do not pull: Huber's weights, found from the residuals they leave.
std::vector<std::complex<double>> robust_residuals(const CircuitData& data, const CircuitFit& start) {
  const auto points = usable_points(data);
  CircuitEquations equations(data, points, false);
  Circuit circuit = start.circuit;
  std::vector<std::complex<double>> residuals(points.size());
  std::vector<double> sizes(points.size()), weights(points.size(), 1.0);
  for (int round = 0; round < 6; ++round) {
    for (std::size_t i = 0; i < points.size(); ++i) {
      residuals[i] = equations.residual(circuit, i);
      sizes[i] = std::abs(residuals[i]);
    }
    if (round == 5) break;
    const double usual = std::fmax(median(sizes) / 1.1774, 1e-300);   // median of a Rayleigh law of deviation 1
    for (std::size_t i = 0; i < points.size(); ++i) weights[i] = std::fmin(1, 1.5 * usual / std::fmax(sizes[i], 1e-300));
    equations.weigh(weights);
    circuit = descend(equations, circuit, 0, 40, 1e-3).circuit;
  }
  return residuals;
}

/// Whether a second tank explains more than three single points that happen to lie badly.
bool widely_better(const CircuitData& data, const CircuitFit& single, const CircuitFit& two) {
  const auto before = robust_residuals(data, single);
  const auto after = in_order(data, two);
  std::vector<double> gains;
  for (std::size_t i = 0; i < before.size(); ++i) gains.push_back(std::norm(before[i]) / (two.scale * two.scale) - std::norm(after[i]));
  std::sort(gains.begin(), gains.end(), std::greater<>());
  double rest = 0;
  for (std::size_t i = kSinglePoints; i < gains.size(); ++i) rest += gains[i];
  return rest > static_cast<double>(two.order.size() - single.order.size()) * std::log(two.dof);
}

Result<Tried> try_families(const CircuitData& data, const CircuitChoiceOptions& options) {
  Tried tried;
  std::optional<Error> error;
  const auto families = options.families.empty() ? usual_families() : options.families;
  for (const CircuitFamily& family : families) {
    Result<CircuitFit> fit = fit_family(data, family, options, tried);
    if (fit) add(data, std::move(*fit), tried);
    else if (!error) error = fit.error();
  }
  if (tried.fits.empty()) return tl::make_unexpected(*error);
  rank(tried);
  if (!options.families.empty() || !shows_structure(data, tried.fits[tried.best])) return tried;

  // Skin and relaxation together (a winding of thick wire over a core) where one of them is not enough.
  for (const bool loss : {false, true}) {
    Result<CircuitFit> both = fit_family(data, {.parallel_loss = loss, .skin = true, .relaxation = true}, options, tried);
    if (both && criterion_of(data, *both) < tried.candidates[tried.best].criterion) {
      add(data, std::move(*both), tried);
      rank(tried);
    }
  }
  if (!shows_structure(data, tried.fits[tried.best])) return tried;
  // The second tank is looked for from the best circuit of one resonance; only where it pays do all families get one.
  CircuitFamily with = tried.candidates[tried.best].family;
  with.second_resonance = true;
  Result<CircuitFit> second = fit_family(data, with, options, tried);
  if (!second || criterion_of(data, *second) >= tried.candidates[tried.best].criterion ||
      !widely_better(data, tried.fits[tried.best], *second)) {
    return tried;
  }
  add(data, *second, tried);
  const std::size_t singles = tried.fits.size() - 1;
  for (std::size_t i = 0; i < singles; ++i) {
    CircuitFamily family = tried.candidates[i].family;
    family.second_resonance = true;
    if (family == with) continue;
    // The tank that was found, with this family's elements beside it.
    Circuit start = tried.fits[i].circuit;
    start.family = family;
    for (const auto p : {CircuitParameter::second_capacitance, CircuitParameter::second_frequency, CircuitParameter::second_damping}) {
      start[p] = second->circuit[p];
    }
    start[CircuitParameter::capacitance] = second->circuit[CircuitParameter::capacitance];
    CircuitFitOptions from = options_of(options);
    from.start = start;
    if (auto fit = fit_circuit(data, family, from)) add(data, std::move(*fit), tried);
  }
  rank(tried);
  return tried;
}

/// Indices in `data` of points that stand out of these residuals (in order of frequency).
std::vector<std::size_t> outliers(const CircuitData& data, std::span<const std::complex<double>> residuals) {
  const auto points = usable_points(data);
  double sigma = neighbour_noise(residuals);
  if (data.scale_known) sigma = std::isnan(sigma) ? 1 : std::fmax(sigma, 1);
  std::vector<std::size_t> list;
  if (!(sigma > 0)) return list;
  const CircuitEquations equations(data, points, false);
  const auto out = standing_out(residuals, sigma, data.scale_known, kFalseAlarms);
  for (std::size_t a = 0, b = 0; a < out.size(); a = b) {
    while (b < out.size() && out[b] == out[a] + (b - a)) ++b;
    if (b - a > kSinglePoints) continue;
    for (std::size_t k = a; k < b; ++k) {
      // The last digits of a file are no bad points, however quiet their neighbours.
      if (std::abs(equations.unwhitened(out[k], residuals[out[k]])) > kLeastError) list.push_back(points[out[k]]);
    }
  }
  std::sort(list.begin(), list.end());
  return list;
}

/// Points whose modulus is far from those of its neighbours (an overflow, a wrong range): a circuit would put a resonance without
/// loss there. They come back when the circuit without them explains them.
std::vector<std::size_t> far_off(const CircuitData& data) {
  const auto points = usable_points(data);
  std::vector<std::complex<double>> sizes;
  for (const std::size_t i : points) sizes.emplace_back(1e4 + std::log(std::abs(data.z[i])));   // far from 0: only neighbours count
  std::vector<std::size_t> list;
  for (const std::size_t k : standing_out(sizes, kFarOff, true, kFalseAlarms)) list.push_back(points[k]);
  std::sort(list.begin(), list.end());
  if (static_cast<double>(list.size()) > kMostLeftOut * static_cast<double>(points.size())) list.clear();
  return list;
}

CircuitData without(const CircuitData& data, std::span<const std::size_t> left_out) {
  CircuitData rest = data;
  for (const std::size_t i : left_out) rest.z[i] = {std::nan(""), std::nan("")};
  return rest;
}

/// Residuals of all usable points of `data` by a circuit fitted to some of them.
std::vector<std::complex<double>> residuals_by(const CircuitData& data, const Circuit& circuit) {
  const CircuitEquations equations(data, usable_points(data), false);
  std::vector<std::complex<double>> list;
  for (std::size_t i = 0; i < equations.size(); ++i) list.push_back(equations.residual(circuit, i));
  return list;
}

}  // namespace

Result<CircuitChoice> choose_circuit(const CircuitData& data, const CircuitChoiceOptions& options) {
  CircuitChoice choice;
  if (options.leave_out) choice.left_out = far_off(data);
  Result<Tried> tried = try_families(without(data, choice.left_out), options);
  if (!tried) return failure(tried);
  if (options.leave_out) {
    const double most = kMostLeftOut * static_cast<double>(usable_points(data).size());
    // The first look is robust, later ones are by the circuit fitted without what was left out.
    auto left_out = outliers(data, robust_residuals(data, tried->fits[tried->best]));
    for (std::size_t round = 0; round < kMostRounds && left_out != choice.left_out; ++round) {
      if (static_cast<double>(left_out.size()) > most) break;
      Result<Tried> again = try_families(without(data, left_out), options);
      if (!again) break;
      choice.left_out = left_out;
      tried = std::move(again);
      left_out = outliers(data, residuals_by(data, tried->fits[tried->best].circuit));
    }
  }
  const CircuitData rest = without(data, choice.left_out);
  CircuitFitOptions last = options_of(options);
  last.limits = true;
  last.quick = false;
  last.start = tried->fits[tried->best].circuit;
  Result<CircuitFit> best = fit_circuit(rest, tried->candidates[tried->best].family, last);
  if (!best || !best->usable()) {
    // Elements that play against each other may not settle, or not be determined: then the best that is stands.
    std::vector<std::size_t> order(tried->candidates.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
      return tried->candidates[a].criterion < tried->candidates[b].criterion;
    });
    for (const std::size_t k : order) {
      last.start = tried->fits[k].circuit;
      Result<CircuitFit> other = fit_circuit(rest, tried->candidates[k].family, last);
      if (!other || !other->usable()) continue;
      best = std::move(other);
      if (tried->second == k) tried->second = tried->best;
      tried->best = k;
      break;
    }
  }
  if (!best) return failure(best);
  choice.best = std::move(*best);
  if (tried->second != tried->best) {
    choice.runner_up = tried->candidates[tried->second];
    choice.lead = choice.runner_up->criterion - tried->candidates[tried->best].criterion;
  }
  choice.candidates = tried->candidates;
  std::stable_sort(choice.candidates.begin(), choice.candidates.end(),
                   [](const CircuitCandidate& a, const CircuitCandidate& b) { return a.criterion < b.criterion; });
  return choice;
}

}  // namespace coilassay

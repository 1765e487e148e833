#include "analysis/coupling_solution.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>
#include <tuple>

#include "analysis/coupling_start.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;

constexpr double kSeen = 20;          // drop of chi-square by which a further element is believed
constexpr double kMisfitRatio = 1.1;  // residuals over scatter
constexpr double kLost = 100;         // chi-square over its degrees of freedom of a fit that is in the wrong place
constexpr double kDisagree = 1e-3;    // probability of a chi-square this large

/// Rows of a reading: one when it is real, two when complex.
std::size_t rows_of(const CouplingReading& r) { return r.real ? 1 : 2; }

/// The logarithm of a ratio near one; std::log goes to great lengths there for digits that no reading has.
Complex near_log(Complex q) { return {std::log(std::norm(q)) / 2, std::atan2(q.imag(), q.real())}; }

struct Model {
  std::vector<CouplingTrace> traces;
  std::vector<CouplingPrior> priors;
  std::size_t shared_count = 0;
  bool squared = false;
  double skin_hz = 1;
  double label_sign = 1;   // what "aiding" means when the sign is seen otherwise

  WindingPair pair_at(std::span<const double> x) const {
    WindingPair p;
    p.l1_h = std::exp(x[kLnL1]);
    p.l2_h = std::exp(x[kLnL2]);
    const double product = p.l1_h * p.l2_h;
    p.m_squared_h2 = (squared ? x[kCoupling] : x[kCoupling] * x[kCoupling]) * product;
    p.m_h = squared ? std::sqrt(std::fmax(x[kCoupling], 0) * product) : x[kCoupling] * std::sqrt(product);
    p.r1_ohm = x[kR1];
    p.r2_ohm = x[kR2];
    p.skin1_ohm = x[kSkin1];
    p.skin2_ohm = x[kSkin2];
    p.skin_hz = skin_hz;
    p.c1_f = x[kC1];
    p.c2_f = x[kC2];
    p.link_h = x[kLink];
    p.link_ohm = x[kLinkR];
    return p;
  }

  void residuals_of(const CouplingTrace& trace, const WindingPair& pair, std::span<const double> x, double*& out) const {
    CouplingItem item = trace.item;
    if (label_sign < 0 && item == CouplingItem::aiding) item = CouplingItem::opposing;
    else if (label_sign < 0 && item == CouplingItem::opposing) item = CouplingItem::aiding;
    for (const CouplingReading& r : trace.readings) {
      Complex shared = 0;
      for (const auto& [error, effect] : r.shared) shared += effect * x[kFirstShared + error];
      if (r.real) {
        double value = 0;
        if (!std::isfinite(r.omega)) {
          value = predicted_ideal(item, pair);
        } else {
          const Complex z = predicted(item, pair, r.omega);
          value = is_ratio(item) ? std::copysign(std::abs(z), z.real()) : z.imag() / r.omega;
        }
        *out++ = (r.size - value * (1 + shared.real())) / r.u_size;
      } else {
        const Complex z = predicted(item, pair, r.omega);
        const Complex left = r.reference > 0 ? (r.z - z * (1.0 + shared)) / (r.reference * std::polar(1.0, std::arg(z)))
                                             : near_log(r.z / z) - shared;
        *out++ = left.real() / r.u_size;
        *out++ = left.imag() / r.u_angle;
      }
    }
  }

  bool operator()(std::span<const double> x, std::span<double> r) const {
    if (std::fabs(x[kLnL1]) > 60 || std::fabs(x[kLnL2]) > 60) return false;
    const WindingPair pair = pair_at(x);
    double* out = r.data();
    for (const CouplingTrace& trace : traces) residuals_of(trace, pair, x, out);
    for (const CouplingPrior& prior : priors) *out++ = (prior.error.value - x[prior.unknown]) / prior.error.law.standard_uncertainty;
    for (std::size_t i = 0; i < shared_count; ++i) *out++ = -x[kFirstShared + i];
    return true;
  }

  std::size_t rows() const {
    std::size_t count = priors.size() + shared_count;
    for (const CouplingTrace& trace : traces) {
      for (const CouplingReading& r : trace.readings) count += rows_of(r);
    }
    return count;
  }
};

double label_sign_of(const CouplingSolution& s) {
  return s.readings.sign_shown && s.fit.parameters.size() > 0 && s.fit.parameters[kCoupling] < 0 ? -1 : 1;
}

Model model_of(const CouplingSolution& s, double label_sign) {
  Model model{s.readings.traces, {}, s.readings.shared.size(), s.squared, s.skin_hz, label_sign};
  for (const CouplingPrior& prior : s.priors) {
    if (!s.fixed[prior.unknown]) model.priors.push_back(prior);
  }
  return model;
}

JointProblem problem_of(const CouplingSolution& s, double label_sign) {
  JointProblem problem;
  const Model model = model_of(s, label_sign);
  problem.residual_count = model.rows();
  problem.residuals = model;
  problem.scale = s.scale;
  problem.fixed = s.fixed;
  return problem;
}

void describe_rows(CouplingSolution& s) {
  s.rows.clear();
  for (std::size_t t = 0; t < s.readings.traces.size(); ++t) {
    const CouplingTrace& trace = s.readings.traces[t];
    for (const CouplingReading& r : trace.readings) {
      for (std::size_t k = 0; k < rows_of(r); ++k) {
        s.rows.push_back({trace.source, trace.law, trace.kind, false, trace.basis, t, trace.scatter});
      }
    }
  }
  for (const CouplingPrior& prior : s.priors) {
    if (s.fixed[prior.unknown]) continue;
    s.rows.push_back({prior.error.source, prior.error.law.kind, prior.error.kind, false, prior.error.basis});
  }
  for (const SharedError& e : s.readings.shared) s.rows.push_back({e.source, e.law, e.kind, e.common, e.basis});
}

/// Residuals of one trace, size and angle apart where it is complex.
struct TraceResiduals {
  std::vector<double> size, angle;
};
std::vector<TraceResiduals> by_trace(const CouplingSolution& s) {
  std::vector<TraceResiduals> all;
  Eigen::Index at = 0;
  for (const CouplingTrace& trace : s.readings.traces) {
    TraceResiduals mine;
    for (const CouplingReading& r : trace.readings) {
      mine.size.push_back(s.fit.residuals[at++]);
      if (!r.real) mine.angle.push_back(s.fit.residuals[at++]);
    }
    all.push_back(std::move(mine));
  }
  return all;
}

double mean_square(const std::vector<double>& r) {
  double sum = 0;
  for (const double x : r) sum += x * x;
  return r.empty() ? 0 : sum / static_cast<double>(r.size());
}

/// By how much neighbours that go together make a mean less certain than its scatter says.
double serial_factor(const std::vector<double>& r) {
  if (r.size() < 10) return 1;
  const double lag = lag_one_correlation(r);
  const double n = static_cast<double>(r.size());
  if (lag < 3.5 / std::sqrt(n)) return 1;
  return std::sqrt((1 + std::fmin(lag, 0.99)) / (1 - std::fmin(lag, 0.99)));
}

/// How much larger residuals are than the scatter that third differences show, where that is more than chance: far larger,
/// or larger and hanging together.
double misfit_of(const std::vector<double>& r, double ratio) {
  const double n = static_cast<double>(r.size());
  // Third differences overlap: the square of their mean square has 2.31 times the variance of independent ones.
  const double spread = std::sqrt((1 + 2.31) / (2 * n));
  const bool far = std::log(ratio) > 5 * spread;
  const bool together = ratio > kMisfitRatio && lag_one_correlation(r) > 4 / std::sqrt(n);
  return ratio > kMisfitRatio && (far || together) ? ratio : 1;
}

enum class Weighing { first, again, last };

/// The scatter that the fit leaves takes the place of the one seen beforehand. The first time tells how well the model
/// fits; the last time residuals that hang together count for fewer.
void weigh_by_residuals(CouplingSolution& s, Weighing round) {
  const std::vector<TraceResiduals> residuals = by_trace(s);
  // Traces too short to show their own scatter share one factor.
  double short_sum = 0, short_rows = 0;
  for (std::size_t t = 0; t < residuals.size(); ++t) {
    const CouplingTrace& trace = s.readings.traces[t];
    if (!trace.scatter || trace.readings.size() >= 7) continue;
    short_sum += mean_square(residuals[t].size) * static_cast<double>(residuals[t].size.size()) +
                 mean_square(residuals[t].angle) * static_cast<double>(residuals[t].angle.size());
    short_rows += 2 * static_cast<double>(trace.readings.size());
  }
  const double short_dof = std::fmin(short_rows, s.degrees);
  const double short_factor = short_dof >= 1 ? std::sqrt(short_sum / short_dof) : 1;
  for (std::size_t t = 0; t < residuals.size(); ++t) {
    CouplingTrace& trace = s.readings.traces[t];
    if (!trace.scatter) continue;
    double of_size = short_factor, of_angle = short_factor;
    if (trace.readings.size() >= 7) {
      // The fit takes about two readings of each trace; and a scatter that is itself an estimate of n - 2 of them makes the
      // mean square of an error (n - 2)/(n - 4) of what it says.
      const double n = static_cast<double>(trace.readings.size());
      const double left = n / std::fmax(n - (round == Weighing::last ? 4 : 2), 1);
      of_size = std::sqrt(mean_square(residuals[t].size) * left);
      of_angle = std::sqrt(mean_square(residuals[t].angle) * left);
      if (round == Weighing::first) {
        s.checks[t].misfit = std::fmax(misfit_of(residuals[t].size, of_size), misfit_of(residuals[t].angle, of_angle));
      }
      if (round == Weighing::last) {
        of_size *= serial_factor(residuals[t].size);
        of_angle *= serial_factor(residuals[t].angle);
      }
    }
    for (CouplingReading& r : trace.readings) {
      r.u_size = std::fmax(r.u_size * of_size, kLeastCouplingNoise);
      r.u_angle = std::fmax(r.u_angle * of_angle, kLeastCouplingNoise);
    }
  }
}

void fit_again(CouplingSolution& s, const Eigen::VectorXd& start) {
  s.fit = fit_jointly(problem_of(s, label_sign_of(s)), {start.data(), static_cast<std::size_t>(start.size())});
  s.degrees = static_cast<double>(s.fit.residuals.size()) - static_cast<double>(s.fit.rank);
}

/// Tries further unknowns; keeps them when chi-square says so and they are possible (positive).
bool try_unknowns(CouplingSolution& s, std::initializer_list<std::size_t> unknowns) {
  CouplingSolution tried = s;
  bool any = false;
  for (const std::size_t u : unknowns) {
    any = any || tried.fixed[u];
    tried.fixed[u] = false;
  }
  if (!any) return false;
  // What a whole fit would gain is seen from where the last one stands, within a factor that curvature makes.
  const std::span<const double> here(s.fit.parameters.data(), static_cast<std::size_t>(s.fit.parameters.size()));
  if (!(promised_drop(problem_of(tried, label_sign_of(s)), here) > kSeen / 4)) return false;
  fit_again(tried, s.fit.parameters);
  if (!(tried.fit.chi_square < s.fit.chi_square - kSeen)) return false;
  for (const std::size_t u : unknowns) {
    if (tried.fit.parameters[static_cast<Eigen::Index>(u)] < 0) {
      tried.fixed[u] = true;
      tried.fit.parameters[static_cast<Eigen::Index>(u)] = 0;
    }
  }
  fit_again(tried, tried.fit.parameters);
  if (!(tried.fit.chi_square < s.fit.chi_square - kSeen)) return false;
  s = std::move(tried);
  return true;
}

/// Fits again from capacitances that make each winding resonate above the sweep, and keeps what is better.
void start_further_on(CouplingSolution& s) {
  CouplingSolution best = s;
  for (const double part : {0.03, 0.1, 0.3}) {
    CouplingSolution tried = s;
    tried.fixed[kC1] = tried.fixed[kC2] = false;
    Eigen::VectorXd x = s.fit.parameters;
    // The scale of a capacitance is a tenth of what resonates at the last frequency.
    for (const Eigen::Index c : {Eigen::Index{kC1}, Eigen::Index{kC2}}) x[c] = 10 * part * s.scale[static_cast<std::size_t>(c)];
    fit_again(tried, x);
    if (tried.fit.chi_square < best.fit.chi_square && tried.fit.parameters[kC1] >= 0 && tried.fit.parameters[kC2] >= 0) best = tried;
  }
  s = std::move(best);
}

bool over_frequency(const CouplingReadings& readings, std::initializer_list<CouplingItem> items) {
  std::vector<double> seen;
  for (const CouplingTrace& trace : readings.traces) {
    if (std::find(items.begin(), items.end(), trace.item) == items.end()) continue;
    for (const CouplingReading& r : trace.readings) {
      if (std::isfinite(r.omega) && std::find(seen.begin(), seen.end(), r.omega) == seen.end()) seen.push_back(r.omega);
    }
    if (seen.size() >= 3) return true;
  }
  return false;
}

double highest_omega(const CouplingReadings& readings) {
  double highest = 0;
  for (const CouplingTrace& trace : readings.traces) {
    for (const CouplingReading& r : trace.readings) {
      if (std::isfinite(r.omega)) highest = std::fmax(highest, r.omega);
    }
  }
  return highest;
}

void set_scales(CouplingSolution& s, const CouplingStart& start) {
  const double omega = highest_omega(s.readings);
  const double w = omega > 0 ? omega : 1e5;
  s.scale.assign(kFirstShared + s.readings.shared.size(), 1.0);
  s.scale[kCoupling] = std::clamp(1 - std::fabs(start.k), 1e-4, 1.0);
  for (const auto& [r, skin, c, l] : {std::tuple{kR1, kSkin1, kC1, start.l1}, std::tuple{kR2, kSkin2, kC2, start.l2}}) {
    s.scale[r] = s.scale[skin] = 1e-2 * w * l;
    s.scale[c] = 1e-1 / (w * w * l);
  }
  s.scale[kLink] = 1e-2 * start.l2;
  s.scale[kLinkR] = 1e-2 * w * start.l2;
  for (const CouplingPrior& prior : s.priors) {
    if (prior.error.law.standard_uncertainty > 0) s.scale[prior.unknown] = prior.error.law.standard_uncertainty;
  }
  s.skin_hz = w / (2 * std::numbers::pi);
}

void check_traces(CouplingSolution& s) {
  for (std::size_t i = 0; i < s.rows.size(); ++i) {
    if (s.rows[i].trace >= s.checks.size()) continue;
    const double r = s.fit.residuals[static_cast<Eigen::Index>(i)];
    s.checks[s.rows[i].trace].chi_square += r * r;
    ++s.checks[s.rows[i].trace].rows;
  }
}

/// How well inputs agree that are not weighed by their own scatter; what they add to a fit of the others alone.
void judge_agreement(CouplingSolution& s) {
  double chi_square = s.fit.chi_square, degrees = s.degrees;
  bool scatters = false;
  for (const CouplingTrace& trace : s.readings.traces) scatters = scatters || trace.scatter;
  if (scatters) {
    CouplingSolution alone = s;
    std::erase_if(alone.readings.traces, [](const CouplingTrace& trace) { return !trace.scatter; });
    fit_again(alone, s.fit.parameters);
    chi_square -= alone.fit.chi_square;
    degrees -= alone.degrees;
  }
  if (degrees < 0.5) return;
  chi_square = std::fmax(chi_square, 0);
  s.p_value = f_upper_tail(chi_square / degrees, degrees, std::numeric_limits<double>::infinity());
  if (s.p_value < kDisagree) s.widened = std::sqrt(chi_square / degrees);
}

double real_part(const CouplingReadings& readings, CouplingItem item) {
  for (const CouplingTrace& trace : readings.traces) {
    if (trace.item == item && !trace.readings.empty() && !trace.readings.front().real) {
      return std::fmax(trace.readings.front().z.real(), 0);
    }
  }
  return 0;
}

}  // namespace

WindingPair CouplingSolution::pair_at(std::span<const double> unknowns) const {
  Model model;
  model.squared = squared;
  model.skin_hz = skin_hz;
  return model.pair_at(unknowns);
}

JointProblem CouplingSolution::problem() const { return problem_of(*this, label_sign_of(*this)); }

CouplingSolution solve_coupling(CouplingReadings readings, std::vector<CouplingPrior> priors) {
  CouplingSolution s;
  s.readings = std::move(readings);
  s.priors = std::move(priors);
  s.squared = !s.readings.shows_m;
  s.checks.resize(s.readings.traces.size());
  const CouplingStart start = coupling_start(s.readings);
  set_scales(s, start);
  Eigen::VectorXd x = Eigen::VectorXd::Zero(static_cast<Eigen::Index>(s.scale.size()));
  x[kLnL1] = std::log(start.l1);
  x[kLnL2] = std::log(start.l2);
  x[kCoupling] = s.squared ? start.k * start.k : start.k;
  // First the bare windings, which tells whether the other side of a short is known at all.
  s.fixed.assign(s.scale.size(), false);
  for (std::size_t u = kR1; u < kFirstShared; ++u) s.fixed[u] = true;
  if (s.readings.complex_read) {
    s.fixed[kR1] = s.fixed[kR2] = false;
    x[kR1] = real_part(s.readings, CouplingItem::primary_open);
    x[kR2] = real_part(s.readings, CouplingItem::secondary_open);
  }
  // A winding that is only shorted or left open, never measured, has no scale of its own: the other's serves.
  for (const CouplingTrace& trace : s.readings.traces) {
    const bool only_first = trace.item == CouplingItem::primary_open || trace.item == CouplingItem::primary_short;
    const bool only_second = trace.item == CouplingItem::secondary_open || trace.item == CouplingItem::secondary_short;
    s.side1 = s.side1 || !only_second;
    s.side2 = s.side2 || !only_first;
  }
  s.fixed[kLnL1] = !s.side1;
  s.fixed[kLnL2] = !s.side2;
  fit_again(s, x);
  const auto known = [&](std::size_t unknown) {
    if ((unknown == kLnL1 && !s.side1) || (unknown == kLnL2 && !s.side2)) return false;
    Eigen::VectorXd gradient = Eigen::VectorXd::Zero(x.size());
    gradient[static_cast<Eigen::Index>(unknown)] = 1;
    return determined(s.fit, s.scale, gradient);
  };
  bool shorted = false;
  for (const CouplingTrace& trace : s.readings.traces) {
    const bool one = trace.item == CouplingItem::primary_short, two = trace.item == CouplingItem::secondary_short;
    shorted = shorted || one || two;
    if ((one && !known(kLnL2)) || (two && !known(kLnL1))) s.link_referred = false;
  }
  for (const CouplingPrior& prior : s.priors) {
    const bool of_link = prior.unknown == kLink || prior.unknown == kLinkR;
    if ((of_link && !shorted) || !s.link_referred) continue;
    const Eigen::Index at = static_cast<Eigen::Index>(prior.unknown);
    s.fit.parameters[at] = prior.error.value;
    if (prior.error.law.standard_uncertainty > 0) s.fixed[prior.unknown] = false;
  }
  // A prior of a resistance that the readings see is one more reading of it; one that is exact holds it.
  for (const CouplingPrior& prior : s.priors) {
    if (!(prior.error.law.standard_uncertainty > 0) && (prior.unknown == kR1 || prior.unknown == kR2)) s.fixed[prior.unknown] = true;
  }
  fit_again(s, s.fit.parameters);

  using enum CouplingItem;
  const bool first = over_frequency(s.readings, {primary_open, mutual_21, mutual_12, ratio_reverse});
  const bool second = over_frequency(s.readings, {secondary_open, mutual_21, mutual_12, ratio_forward});
  const bool series = over_frequency(s.readings, {aiding, opposing, primary_short, secondary_short});
  if (first || second || series) {
    if (first && second) try_unknowns(s, {kC1, kC2});
    // Windings in series may resonate inside the sweep, where the way from no capacitance down is blocked: from further on.
    if (first && second && s.fit.chi_square > kLost * s.degrees) start_further_on(s);
    if (first || series) try_unknowns(s, {kC1});
    if (second || series) try_unknowns(s, {kC2});
    if (s.readings.complex_read && highest_omega(s.readings) > 0) {
      try_unknowns(s, {kSkin1, kSkin2});
      try_unknowns(s, {kSkin1});
      try_unknowns(s, {kSkin2});
    }
  }
  s.as_scattered = s.readings.traces;
  for (const Weighing round : {Weighing::first, Weighing::again, Weighing::last}) {
    weigh_by_residuals(s, round);
    fit_again(s, s.fit.parameters);
  }
  describe_rows(s);
  check_traces(s);
  s.k_determined = known(kCoupling);
  judge_agreement(s);
  return s;
}

BoundedInterval coupling_interval(const CouplingSolution& s, double low, double factor_two_sided, double factor_one_sided) {
  const JointProblem problem = s.problem();
  BoundedRequest request;
  request.best = s.fit.parameters[kCoupling];
  request.u = std::sqrt(s.fit.covariance(kCoupling, kCoupling)) * s.widened;
  request.low = s.squared ? 0 : low;
  request.high = 1;
  request.factor_two_sided = factor_two_sided;
  request.factor_one_sided = factor_one_sided;
  const double w = s.widened * s.widened;
  // Many readings make chi-square a parabola to any wanted accuracy, and dear to compute.
  const double width = 5 * request.u;
  const bool many = s.fit.residuals.size() > 60;
  const double room = std::fmin(request.best - request.low, request.high - request.best);
  if (many && room > width) {
    const auto parabola = [&](double x) { return (x - request.best) * (x - request.best) / (request.u * request.u); };
    return bounded_interval(request, parabola);
  }
  return bounded_interval(request, [&](double x) { return profile_chi_square(problem, s.fit, kCoupling, x) / w; });
}

double chi_square_without(const CouplingSolution& s, std::size_t trace) {
  CouplingSolution left = s;
  left.readings.traces.erase(left.readings.traces.begin() + static_cast<std::ptrdiff_t>(trace));
  if (left.readings.traces.empty()) return std::nan("");
  fit_again(left, s.fit.parameters);
  return left.fit.chi_square;
}

CouplingSolution as_scattered(const CouplingSolution& s) {
  CouplingSolution plain = s;
  plain.readings.traces = s.as_scattered;
  fit_again(plain, s.fit.parameters);
  return plain;
}

CouplingSolution with_free_link(const CouplingSolution& s) {
  CouplingSolution freed = s;
  std::erase_if(freed.priors, [](const CouplingPrior& prior) { return prior.unknown == kLink; });
  freed.fixed[kLink] = false;
  freed.scale[kLink] = 1e-3 * std::exp(s.fit.parameters[kLnL2]);
  fit_again(freed, s.fit.parameters);
  return freed;
}

CouplingSolution with_traces(const CouplingSolution& s, std::vector<CouplingTrace> traces) {
  CouplingSolution other = s;
  other.readings.traces = std::move(traces);
  const CouplingStart start = coupling_start(other.readings);
  Eigen::VectorXd x = s.fit.parameters;
  x[kLnL1] = std::log(start.l1);
  x[kLnL2] = std::log(start.l2);
  x[kCoupling] = s.squared ? start.k * start.k : start.k;
  fit_again(other, x);
  return other;
}

}  // namespace coilassay

#include "analysis/coupling_result.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "analysis/coupling_accuracy.h"
#include "analysis/coupling_contradiction.h"
#include "analysis/symbols.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kBeyondChance = 3.5;    // standard uncertainties
constexpr double kLopsided = 0.15;       // halves that differ by more are not symmetric

enum Output : std::size_t { kL1Out, kL2Out, kMOut, kKOut, kNOut, kLeak1, kLeak2, kOneMinus, kKOverN, kKTimesN, kOutputs };
constexpr std::array kSymbolsOut = {"L_1", "L_2", "M", "k", "n", "L_leak_1", "L_leak_2", "one_minus_k", "k_over_n", "k_times_n"};

/// Everything at once from the unknowns; at a frequency the values that the terminals show there.
std::array<double, kOutputs> outputs_at(const CouplingSolution& s, std::span<const double> x, double omega, double sign) {
  const WindingPair pair = s.pair_at(x);
  double l1 = pair.l1_h, l2 = pair.l2_h, m = pair.m_h;
  double k_squared = pair.m_squared_h2 / (l1 * l2);
  if (std::isfinite(omega) && (pair.c1_f != 0 || pair.c2_f != 0)) {
    l1 = predicted(CouplingItem::primary_open, pair, omega).imag() / omega;
    l2 = predicted(CouplingItem::secondary_open, pair, omega).imag() / omega;
    m = predicted(CouplingItem::mutual_21, pair, omega).imag() / omega;
    k_squared = m * m / (l1 * l2);
  }
  const double k = s.squared ? std::sqrt(k_squared) : std::copysign(std::sqrt(k_squared), m);   // NaN below zero
  std::array<double, kOutputs> y;
  y[kL1Out] = l1;
  y[kL2Out] = l2;
  y[kMOut] = sign * (s.squared ? k * std::sqrt(l1 * l2) : m);
  y[kKOut] = sign * k;
  y[kNOut] = std::sqrt(l1 / l2);
  y[kLeak1] = l1 * (1 - k_squared);
  y[kLeak2] = l2 * (1 - k_squared);
  y[kOneMinus] = 1 - std::fabs(k);
  y[kKOverN] = k / y[kNOut];
  y[kKTimesN] = k * y[kNOut];
  return y;
}

double sign_of(const CouplingSolution& s, const CouplingRequest& request) {
  if (s.readings.sign_shown) return 1;
  const bool negative_label = !s.squared && s.fit.parameters[kCoupling] < 0;
  const double wanted = request.dots == Dots::opposite ? -1 : 1;
  return negative_label ? -wanted : wanted;
}

/// The errors as inputs of a measurement function: one for each reading that has a law, the scatter as a fit.
struct Errors {
  std::vector<InputError> inputs;
  std::vector<Eigen::Index> rows;
  FittedInputs fitted;
};

Errors errors_of(const CouplingSolution& s) {
  Errors errors;
  const Eigen::Index n = s.fit.parameters.size();
  errors.fitted.source = "noise of the sweeps";
  errors.fitted.values = Eigen::VectorXd::Zero(n);
  errors.fitted.covariance = Eigen::MatrixXd::Zero(n, n);
  for (std::size_t i = 0; i < s.rows.size(); ++i) {
    const CouplingRow& row = s.rows[i];
    const Eigen::Index at = static_cast<Eigen::Index>(i);
    if (row.scatter) {
      errors.fitted.covariance += s.widened * s.widened * s.fit.gain.col(at) * s.fit.gain.col(at).transpose();
      continue;
    }
    InputError input;
    input.source = row.source;
    input.law = {row.law, s.widened, 0};
    input.kind = row.kind;
    input.common = row.common;
    input.basis = row.basis;
    errors.inputs.push_back(std::move(input));
    errors.rows.push_back(at);
  }
  if (errors.fitted.covariance.cwiseAbs().maxCoeff() == 0) {
    errors.fitted.values.resize(0);
    errors.fitted.covariance.resize(0, 0);
  }
  return errors;
}

std::vector<double> unknowns_of(const CouplingSolution& s, const Errors& errors, std::span<const double> e) {
  Eigen::VectorXd x = s.fit.parameters;
  for (std::size_t i = 0; i < errors.rows.size(); ++i) x += s.fit.gain.col(errors.rows[i]) * e[i];
  for (Eigen::Index i = 0; i < errors.fitted.values.size(); ++i) x[i] += e[errors.rows.size() + static_cast<std::size_t>(i)];
  return {x.data(), x.data() + x.size()};
}

Eigen::VectorXd gradient_of(const CouplingSolution& s, std::size_t output, double omega) {
  Eigen::VectorXd gradient = Eigen::VectorXd::Zero(s.fit.parameters.size());
  std::vector<double> x(s.fit.parameters.data(), s.fit.parameters.data() + s.fit.parameters.size());
  for (std::size_t i = 0; i < kFirstShared; ++i) {
    const double h = 1e-5 * s.scale[i], kept = x[i];
    x[i] = kept + h;
    const double up = outputs_at(s, x, omega, 1)[output];
    x[i] = kept - h;
    const double down = outputs_at(s, x, omega, 1)[output];
    x[i] = kept;
    gradient[static_cast<Eigen::Index>(i)] = (up - down) / (2 * h);
  }
  return gradient;
}

/// Which outputs the readings determine. k^2 stands for k where k itself has no slope or no value.
std::array<bool, kOutputs> determined_outputs(const CouplingSolution& s, double omega) {
  std::array<bool, kOutputs> known{};
  for (std::size_t o = 0; o < kOutputs; ++o) {
    Eigen::VectorXd gradient = gradient_of(s, o, omega);
    if (!gradient.allFinite() && s.k_determined && (o == kKOut || o == kOneMinus)) known[o] = true;
    else known[o] = determined(s.fit, s.scale, gradient);
  }
  if (!s.side1 || !s.side2) {
    for (const Output o : {s.side1 ? kL2Out : kL1Out, s.side1 ? kLeak2 : kLeak1, kMOut, kNOut, kKOverN, kKTimesN}) known[o] = false;
  }
  if (s.k_determined) known[kKOut] = known[kOneMinus] = true;
  if (known[kKOut]) known[kKOverN] = known[kKTimesN] = false;   // then k and n say it better
  return known;
}

std::vector<ErrorLaw> laws_of_k(const CouplingSolution& s) {
  std::vector<ErrorLaw> laws;
  double scatter = 0;
  for (std::size_t i = 0; i < s.rows.size(); ++i) {
    const double u = std::fabs(s.fit.gain(kCoupling, static_cast<Eigen::Index>(i))) * s.widened;
    if (s.rows[i].scatter) scatter += u * u;
    else if (u > 0) laws.push_back({s.rows[i].law, u, 0});
  }
  if (scatter > 0) laws.push_back({ErrorLaw::Kind::normal, std::sqrt(scatter), 0});
  return laws;
}

void add_at(Measurement& to, const CouplingSolution& s, const CouplingRequest& request, double omega) {
  const Errors errors = errors_of(s);
  const std::array<bool, kOutputs> known = determined_outputs(s, omega);
  const double sign = sign_of(s, request);
  std::vector<OutputSpec> specs;
  for (const char* symbol : kSymbolsOut) {
    specs.push_back({symbol, false, std::isfinite(omega) ? std::optional(omega / kTwoPi) : std::nullopt});
  }
  const auto function = [&](std::span<const double> e, std::span<double> y) {
    const auto all = outputs_at(s, unknowns_of(s, errors, e), omega, sign);
    for (std::size_t o = 0; o < kOutputs; ++o) y[o] = known[o] ? all[o] : std::nan("");
  };
  add_estimates(to, errors.inputs, errors.fitted, specs, function, {}, request.propagation);
}

Estimate* find_estimate(std::vector<Estimate>& estimates, std::string_view symbol) {
  for (Estimate& each : estimates) {
    if (each.symbol == symbol) return &each;
  }
  return nullptr;
}

void take_away(Measurement& m, std::string_view symbol) {
  std::erase_if(m.estimates, [&](const Estimate& e) { return e.symbol == symbol; });
  m.budget.erase(std::string(symbol));
  std::erase_if(m.correlations, [&](const Measurement::Correlation& c) { return c.a == symbol || c.b == symbol; });
}

void set_interval(Estimate* e, double low, double high) {
  if (e == nullptr) return;
  e->low = std::fmin(low, e->quantity.value);
  e->high = std::fmax(high, e->quantity.value);
  if (e->quantity.standard_uncertainty > 0) e->k = e->half_width() / e->quantity.standard_uncertainty;
}

/// k, M and 1 - k get the interval of chi-square over k instead of the straight line's.
void apply_interval(Measurement& m, const CouplingVerdict& v) {
  Estimate* k = find_estimate(m.estimates, "k");
  if (k == nullptr) return;
  const double sign = k->quantity.value < 0 && v.best > 0 ? -1 : 1;
  const double low = sign > 0 ? v.low : -v.high, high = sign > 0 ? v.high : -v.low;
  set_interval(k, low, high);
  if (Estimate* mutual = find_estimate(m.estimates, "M"); mutual != nullptr && k->quantity.value != 0) {
    const double down = k->quantity.value - low, up = high - k->quantity.value;
    if (std::fabs(up - down) > kLopsided * std::fmax(up, down)) {
      // The part of k for each side by itself, that of L_1 and L_2 beside it.
      const double per_k = mutual->quantity.value / k->quantity.value;
      const double u_k = k->quantity.standard_uncertainty * per_k;
      const double others = 1.96 * std::sqrt(std::fmax(std::pow(mutual->quantity.standard_uncertainty, 2) - u_k * u_k, 0));
      set_interval(mutual, mutual->quantity.value - std::hypot(down * per_k, others), mutual->quantity.value + std::hypot(up * per_k, others));
    }
  }
  const double largest = std::fmax(std::fabs(low), std::fabs(high));
  const double smallest = low < 0 && high > 0 ? 0 : std::fmin(std::fabs(low), std::fabs(high));
  set_interval(find_estimate(m.estimates, "one_minus_k"), 1 - largest, 1 - smallest);
}

/// Only limits are known: they stand in the place of k and of what follows from it.
void to_bounds(Measurement& m, const CouplingVerdict& v) {
  const Estimate* l1 = m.find("L_1");
  const Estimate* l2 = m.find("L_2");
  for (const char* symbol : {"k", "M", "one_minus_k"}) take_away(m, symbol);
  if (v.beyond || (v.at_low && v.at_high)) {
    for (const char* symbol : {"L_leak_1", "L_leak_2"}) take_away(m, symbol);
    return;
  }
  Bound k{"k", Unit::one, std::nullopt, std::nullopt, 0.95}, mutual{"M", Unit::henry, std::nullopt, std::nullopt, 0.95};
  if (!v.at_low) k.at_least = v.low;
  if (!v.at_high) k.at_most = v.high;
  if (!k.at_least && !k.at_most) return;
  m.bounds.push_back(k);
  if (l1 != nullptr && l2 != nullptr) {
    const double middle = std::sqrt(l1->quantity.value * l2->quantity.value);
    const double relative = std::hypot(l1->half_width() / l1->quantity.value, l2->half_width() / l2->quantity.value) / 2;
    if (k.at_least) mutual.at_least = *k.at_least * middle * (1 - relative);
    if (k.at_most) mutual.at_most = *k.at_most * middle * (1 + relative);
    m.bounds.push_back(mutual);
  }
  if (!v.at_low) {
    // Close coupling: the leakage has an upper limit only.
    for (const auto& [symbol, open] : {std::pair{"L_leak_1", l1}, std::pair{"L_leak_2", l2}}) {
      if (open == nullptr) continue;
      const double most = open->high * (1 - v.low * v.low);
      take_away(m, symbol);
      m.bounds.push_back({symbol, Unit::henry, std::nullopt, most, 0.95});
    }
    m.bounds.push_back({"one_minus_k", Unit::one, std::nullopt, 1 - v.low, 0.95});
  } else {
    for (const auto& [symbol, open] : {std::pair{"L_leak_1", l1}, std::pair{"L_leak_2", l2}}) {
      const Estimate* leak = m.find(symbol);
      if (leak != nullptr && open != nullptr && leak->quantity.value > open->quantity.value) take_away(m, symbol);
    }
  }
}

Estimate element(const CouplingSolution& s, const Errors& errors, const std::string& name, Unit unit,
                 const std::function<double(std::span<const double>)>& f, std::vector<double>& slopes) {
  std::vector<double> e(errors.rows.size() + static_cast<std::size_t>(errors.fitted.values.size()), 0.0);
  const double value = f(unknowns_of(s, errors, e));
  std::vector<ErrorLaw> laws;
  double variance = 0;
  slopes.clear();
  for (std::size_t i = 0; i < errors.rows.size(); ++i) {
    const double u = errors.inputs[i].law.standard_uncertainty;
    e[i] = u;
    const double up = f(unknowns_of(s, errors, e));
    e[i] = -u;
    const double down = f(unknowns_of(s, errors, e));
    e[i] = 0;
    const double slope = (up - down) / 2;
    slopes.push_back(slope);
    if (slope != 0) laws.push_back({errors.inputs[i].law.kind, std::fabs(slope), 0});
    variance += slope * slope;
  }
  if (errors.fitted.values.size() > 0) {
    // The scatter's directions, one by one.
    for (std::size_t i = 0; i < s.rows.size(); ++i) {
      if (!s.rows[i].scatter) continue;
      const Eigen::VectorXd step = s.fit.gain.col(static_cast<Eigen::Index>(i)) * s.widened;
      std::vector<double> x(s.fit.parameters.data(), s.fit.parameters.data() + s.fit.parameters.size()), y = x;
      for (std::size_t p = 0; p < x.size(); ++p) x[p] += step[static_cast<Eigen::Index>(p)], y[p] -= step[static_cast<Eigen::Index>(p)];
      slopes.push_back((f(x) - f(y)) / 2);
      variance += slopes.back() * slopes.back();
    }
    double scatter = variance;
    for (const ErrorLaw& law : laws) scatter -= law.standard_uncertainty * law.standard_uncertainty;
    laws.push_back({ErrorLaw::Kind::normal, std::sqrt(std::fmax(scatter, 0)), 0});
  }
  Estimate estimate;
  estimate.symbol = name;
  estimate.quantity = {value, std::sqrt(variance), unit};
  estimate.k = coverage_factor(laws);
  estimate.low = value - estimate.k * estimate.quantity.standard_uncertainty;
  estimate.high = value + estimate.k * estimate.quantity.standard_uncertainty;
  return estimate;
}

void add_equivalents(Measurement& m, const CouplingSolution& s, const CouplingRequest& request) {
  const double sign = sign_of(s, request);
  const Errors errors = errors_of(s);
  using Function = std::function<double(std::span<const double>)>;
  const auto out = [&s, sign](std::span<const double> x) { return outputs_at(s, x, std::nan(""), sign); };
  struct Item {
    const char* name;
    Unit unit;
    Function value;
  };
  const std::vector<std::pair<const char*, std::vector<Item>>> circuits = {
      {"T",
       {{"L_a", Unit::henry, [out](auto x) { const auto y = out(x); return y[kL1Out] - y[kMOut]; }},
        {"L_b", Unit::henry, [out](auto x) { const auto y = out(x); return y[kL2Out] - y[kMOut]; }},
        {"L_m", Unit::henry, [out](auto x) { return out(x)[kMOut]; }}}},
      {"cantilever",
       {{"L_series", Unit::henry, [out](auto x) { return out(x)[kLeak1]; }},
        {"L_shunt", Unit::henry, [out](auto x) { const auto y = out(x); return y[kL1Out] - y[kLeak1]; }},
        {"ratio", Unit::one, [out](auto x) { const auto y = out(x); return y[kMOut] / y[kL2Out]; }}}}};
  for (const auto& [name, items] : circuits) {
    Equivalent equivalent;
    equivalent.name = name;
    std::vector<std::vector<double>> slopes(items.size());
    for (std::size_t i = 0; i < items.size(); ++i) {
      equivalent.elements.push_back(element(s, errors, items[i].name, items[i].unit, items[i].value, slopes[i]));
    }
    for (std::size_t a = 0; a < items.size(); ++a) {
      std::vector<double> row;
      for (std::size_t b = 0; b < items.size(); ++b) {
        double sum = 0;
        for (std::size_t i = 0; i < slopes[a].size(); ++i) sum += slopes[a][i] * slopes[b][i];
        const double product = equivalent.elements[a].quantity.standard_uncertainty * equivalent.elements[b].quantity.standard_uncertainty;
        row.push_back(a == b ? 1 : product > 0 ? std::clamp(sum / product, -1.0, 1.0) : 0);
      }
      equivalent.correlation.push_back(std::move(row));
    }
    m.equivalents.push_back(std::move(equivalent));
  }
}

void add_inputs(Measurement& m, const CouplingSolution& s) {
  const std::vector<double> x(s.fit.parameters.data(), s.fit.parameters.data() + s.fit.parameters.size());
  const WindingPair pair = s.pair_at(x);
  Eigen::Index row = 0;
  for (std::size_t t = 0; t < s.readings.traces.size(); ++t) {
    const CouplingTrace& trace = s.readings.traces[t];
    const Eigen::Index first = row;
    for (const CouplingReading& r : trace.readings) row += r.real ? 1 : 2;
    const std::size_t middle = trace.readings.size() / 2;
    const CouplingReading& r = trace.readings[middle];
    InputCheck check;
    check.item = std::string(name(trace.item));
    if (std::isfinite(r.omega)) check.at_hz = r.omega / kTwoPi;
    const Unit unit = is_ratio(trace.item) ? Unit::one : Unit::henry;
    if (r.real) {
      check.value = {r.size, r.u_size, unit};
      check.residual_u = s.fit.residuals[first + static_cast<Eigen::Index>(middle)];
      check.predicted = r.size - check.residual_u * r.u_size;
    } else {
      const double value = is_ratio(trace.item) ? std::abs(r.z) : r.z.imag() / r.omega;
      const Complex z = predicted(trace.item, pair, r.omega);
      check.value = {value, r.u_size * std::abs(value), unit};
      check.predicted = is_ratio(trace.item) ? std::abs(z) : z.imag() / r.omega;
      // Of the reading that is shown. A mean over all of a trace would be nothing by the fit itself.
      check.residual_u = (value - check.predicted) / check.value.standard_uncertainty;
    }
    m.inputs.push_back(std::move(check));
  }
}

/// Also the windings themselves, whatever frequency the quantities are for.
void add_model(Measurement& m, const CouplingSolution& s, const CouplingRequest& request) {
  ModelSummary model;
  model.name = "two coupled windings";
  const auto add = [&](const char* name, std::size_t unknown, Unit unit) {
    const Eigen::Index at = static_cast<Eigen::Index>(unknown);
    const bool seen = !s.fixed[unknown];
    if (!seen && s.fit.parameters[at] == 0) return;
    Eigen::VectorXd own = Eigen::VectorXd::Zero(s.fit.parameters.size());
    own[at] = 1;
    if (seen && !determined(s.fit, s.scale, own)) return;
    model.parameters[name] = {s.fit.parameters[at], seen ? std::sqrt(s.fit.covariance(at, at)) * s.widened : 0, unit};
  };
  if (s.side1) {
    add("R_1", kR1, Unit::ohm);
    add("R_skin_1", kSkin1, Unit::ohm);
    add("C_1", kC1, Unit::farad);
  }
  if (s.side2) {
    add("R_2", kR2, Unit::ohm);
    add("R_skin_2", kSkin2, Unit::ohm);
    add("C_2", kC2, Unit::farad);
  }
  add("L_link", kLink, Unit::henry);
  add("R_link", kLinkR, Unit::ohm);
  const auto y = outputs_at(s, {s.fit.parameters.data(), static_cast<std::size_t>(s.fit.parameters.size())}, std::nan(""), sign_of(s, request));
  const std::array<bool, kOutputs> known = determined_outputs(s, std::nan(""));
  for (const auto& [output, unit] : {std::pair{kL1Out, Unit::henry}, std::pair{kL2Out, Unit::henry}, std::pair{kKOut, Unit::one}}) {
    if (known[output] && std::isfinite(y[output])) model.parameters[kSymbolsOut[output]] = {y[output], std::nan(""), unit};
  }
  if (!s.fixed[kSkin1] || !s.fixed[kSkin2]) model.parameters["f_skin"] = {s.skin_hz, 0, Unit::hertz};
  if (s.fixed[kC1] && s.fixed[kC2]) model.left_out.push_back("winding capacitances: the inputs do not show them");
  model.converged = s.fit.converged;
  if (s.degrees > 0.5) {
    model.reduced_chi_square = s.fit.chi_square / s.degrees;
    model.residual_rms = std::sqrt(s.fit.chi_square / static_cast<double>(std::max<Eigen::Index>(s.fit.residuals.size(), 1)));
  }
  m.model = std::move(model);
}

}  // namespace

CouplingVerdict coupling_verdict(const CouplingSolution& s, bool sign_known) {
  CouplingVerdict v;
  if (!s.k_determined || !(s.fit.covariance(kCoupling, kCoupling) > 0)) return v;
  const std::vector<ErrorLaw> laws = laws_of_k(s);
  double best = s.fit.parameters[kCoupling];
  const double u = std::sqrt(s.fit.covariance(kCoupling, kCoupling)) * s.widened;
  const JointProblem problem = s.problem();
  const auto excess = [&](double limit) {
    return std::sqrt(std::fmax(profile_chi_square(problem, s.fit, kCoupling, limit) - s.fit.chi_square, 0)) / s.widened;
  };
  double low = sign_known ? -1 : 0;
  if (!s.squared && !sign_known && best < -0.5 * u && excess(0) > kBeyondChance) {
    v.labels_swapped = true;
    low = -1;
  }
  if (best > 1 && excess(1) > kBeyondChance) v.beyond = true;
  if (best < -1 && !s.squared && excess(-1) > kBeyondChance) v.beyond = true;
  if (s.squared && best < 0 && excess(0) > kBeyondChance) v.beyond = true;
  const BoundedInterval i = coupling_interval(s, low, coverage_factor(laws, 0.95), coverage_factor(laws, 0.90));
  v.best = i.best;
  v.low = i.low;
  v.high = i.high;
  v.at_low = i.at_low;
  v.at_high = i.at_high;
  if (s.squared) {
    for (double* x : {&v.best, &v.low, &v.high}) *x = std::sqrt(std::fmax(*x, 0));
  } else if (v.labels_swapped || (sign_known && v.best < 0 && v.at_low && !v.at_high)) {
    // Counted the other way round; a bound at -1 is one at 1 of the size.
    v.best = -v.best;
    std::swap(v.low, v.high);
    v.low = -v.low;
    v.high = -v.high;
    std::swap(v.at_low, v.at_high);
  }
  if (!v.labels_swapped && v.low < 0 && sign_known) v.at_low = v.at_low && v.low <= -1;
  v.shown = !v.beyond && !v.at_low && !v.at_high;
  return v;
}

CouplingVerdict add_coupling(Measurement& result, const CouplingSolution& s, const CouplingRequest& request) {
  CouplingVerdict v = coupling_verdict(s, s.readings.sign_shown);
  const std::optional<CouplingSolution> stated = s.k_determined && v.shown ? as_stated(s) : std::nullopt;
  CouplingSolution wide = s;
  if (stated) {
    const double factor = std::sqrt(stated->fit.covariance(kCoupling, kCoupling) / s.fit.covariance(kCoupling, kCoupling)) / s.widened;
    if (factor > 1) wide.widened *= factor;
    v = coupling_verdict(wide, s.readings.sign_shown);
  }
  v.short_over_open = short_above_open(s);
  if (v.short_over_open > 0) {
    v.beyond = true;
    v.shown = false;
  }
  const bool capacitive = !s.fixed[kC1] || !s.fixed[kC2];
  std::vector<double> omegas;
  for (const double f : request.at_hz) omegas.push_back(kTwoPi * f);
  if (omegas.empty()) omegas.push_back(std::nan(""));
  for (std::size_t i = 0; i < omegas.size(); ++i) {
    Measurement at;
    add_at(at, s, request, omegas[i]);
    for (std::size_t o = 0; stated && o < kOutputs; ++o) {
      const Eigen::VectorXd gradient = gradient_of(*stated, o, std::nan(""));
      if (gradient.allFinite()) widen(at, kSymbolsOut[o], std::sqrt(std::fmax(gradient.dot(stated->fit.covariance * gradient), 0)));
    }
    if (s.k_determined) {
      if (!v.shown) to_bounds(at, v);
      else if (!capacitive || !std::isfinite(omegas[i])) apply_interval(at, v);
    }
    const Estimate* k = at.find("k");
    if (k != nullptr && std::fabs(k->quantity.value) < 0.9) take_away(at, "one_minus_k");
    if (i == 0) {
      result.estimates = at.estimates;
      result.bounds = at.bounds;
      result.budget = std::move(at.budget);
      result.correlations = std::move(at.correlations);
      for (Finding& finding : at.findings) {
        // The interval of k comes from chi-square and does not need the straight line.
        if (!(finding.about == "k" && !request.propagation.by_trials)) result.findings.push_back(std::move(finding));
      }
    }
    if (!request.at_hz.empty() && !at.estimates.empty()) {
      Point point;
      point.at_hz = request.at_hz[i];
      point.estimates = std::move(at.estimates);
      point.from = s.readings.complex_read ? "model" : "data";
      result.points.push_back(std::move(point));
    }
  }
  add_inputs(result, s);
  add_model(result, s, request);
  if (v.shown && result.find("L_1") != nullptr && result.find("L_2") != nullptr && result.find("M") != nullptr) add_equivalents(result, wide, request);
  if (v.short_over_open > 0) withhold_coupling(result);
  return v;
}

}  // namespace coilassay

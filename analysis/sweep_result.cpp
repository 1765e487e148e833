#include "analysis/sweep_result.h"

#include <algorithm>
#include <cmath>
#include <functional>
#include <optional>
#include <utility>

#include "base/number_text.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using P = CircuitParameter;
constexpr double kNormalQuantile = 1.96;

Unit unit_of(P parameter) {
  switch (parameter) {
    case P::series_resistance:
    case P::skin_resistance:
    case P::relaxation_resistance: return Unit::ohm;
    case P::inductance: return Unit::henry;
    case P::capacitance:
    case P::second_capacitance: return Unit::farad;
    case P::parallel_conductance: return Unit::siemens;
    case P::second_frequency: return Unit::hertz;
    case P::relaxation_share:
    case P::second_damping: return Unit::one;
  }
  return Unit::one;
}

/// An element that is a quantity of its own.
struct Item {
  const char* symbol;
  P parameter;
  bool inverse = false;   // the quantity is 1/parameter
};

std::vector<Item> items_of(const CircuitFamily& family) {
  std::vector<Item> items = {{"L", P::inductance}, {"R_dc", P::series_resistance}};
  if (family.skin) {
    items.push_back({"R_ac", P::skin_resistance});
  } else if (family.relaxation) {
    items.push_back({"R_ac", P::relaxation_resistance});
  }
  items.push_back({"C_par", P::capacitance});
  if (family.parallel_loss) items.push_back({"R_par", P::parallel_conductance, true});
  return items;
}

/// Standard uncertainty that the errors of the bench give a parameter.
double bench_part(const SweepModel& model, P parameter) {
  const auto at = std::find(model.fit.order.begin(), model.fit.order.end(), parameter) - model.fit.order.begin();
  return model.shifts.cols() == 0 ? 0 : model.shifts.row(at).norm();
}

void add_limit(Measurement& result, const SweepModel& model, const Item& item, const CircuitLimit& limit) {
  const double value = limit.value + kNormalQuantile * bench_part(model, item.parameter);
  Bound bound{item.symbol, item.inverse ? Unit::ohm : unit_of(item.parameter), std::nullopt, std::nullopt, 0.95};
  if (item.inverse) {
    bound.at_least = 1 / value;
  } else {
    bound.at_most = value;
  }
  result.bounds.push_back(std::move(bound));
}

/// A loss the circuit does not have, by how much of it could be there unseen.
void add_hidden(Measurement& result, const SweepModel::Hidden& hidden) {
  const double value = hidden.circuit[hidden.loss];
  if (!(value > 0) || !std::isfinite(value)) return;
  if (hidden.loss == P::parallel_conductance) {
    result.bounds.push_back({"R_par", Unit::ohm, 1 / value, std::nullopt, 0.95});
  } else {
    result.bounds.push_back({"R_ac", Unit::ohm, std::nullopt, value, 0.95});
  }
}

/// A value whose interval reaches zero becomes a limit.
void withhold_unresolved(Measurement& result) {
  for (auto e = result.estimates.begin(); e != result.estimates.end();) {
    const bool element = e->symbol == "R_dc" || e->symbol == "R_ac" || e->symbol == "C_par";
    if (!element || e->low > 0) {
      ++e;
      continue;
    }
    result.bounds.push_back({e->symbol, e->quantity.unit, std::nullopt, std::fmax(e->high, 0), 0.95});
    result.budget.erase(e->symbol);
    e = result.estimates.erase(e);
  }
}

/// How far the elements move between parts of the span, where the circuit does not fit: rectangular.
std::vector<ExtraTerm> misfit_terms(const SweepModel& model, const std::vector<Item>& items, double f_r_hz, double high_hz) {
  std::vector<ExtraTerm> terms;
  const auto add = [&](const std::string& symbol, double spread) {
    if (spread > 0) {
      terms.push_back({symbol, "misfit of the model", {ErrorLaw::Kind::rectangular, spread / std::sqrt(3.0), 0}, 'A', false, "data"});
    }
  };
  for (const Item& item : items) {
    double spread = 0;
    for (const CircuitFit& part : model.drift.parts) {
      spread = std::fmax(spread, std::fabs(part.circuit[item.parameter] - model.fit.circuit[item.parameter]));
    }
    // add_estimates carries terms of a reciprocal output over by its slope: the extra is in ohm.
    const double value = model.fit.circuit[item.parameter];
    add(item.symbol, item.inverse && value > 0 ? spread / (value * value) : spread);
  }
  double spread = 0;
  for (const CircuitFit& part : model.drift.parts) {
    const auto zero = std::isfinite(f_r_hz) ? falling_zero_hz(part.circuit, f_r_hz / 3, std::fmin(3 * f_r_hz, 3 * high_hz)) : std::nullopt;
    if (zero) spread = std::fmax(spread, std::fabs(*zero - f_r_hz));
  }
  if (std::isfinite(f_r_hz)) add("f_r", spread);
  return terms;
}

/// What the choice of the circuit adds to the variance of a quantity. Each circuit the data do not clearly refuse has its value and its
/// uncertainty; the mixture of these laws by their weights (averaging of models as Burnham and Anderson, Sociological
/// Methods & Research 33 (2004) 261, from memory) holds 95 % within some distance of the value of the circuit chosen. A normal law of that
/// reach less the circuit's own.
double variance_of_choice(const SweepModel& model, const std::function<double(const Circuit&)>& value,
                          const std::function<double(const Circuit&, const std::vector<P>&, const Eigen::MatrixXd&)>& variance) {
  struct Law {
    double weight, offset, u;
  };
  const double best = value(model.fit.circuit);
  const Eigen::MatrixXd all = model.fit.fit.covariance + model.shifts * model.shifts.transpose();
  const double own = std::sqrt(variance(model.fit.circuit, model.fit.order, all));
  std::vector<Law> laws;
  double left = 1;
  for (const SweepModel::Alternative& each : model.alternatives) {
    const double offset = value(each.circuit) - best, u = std::sqrt(variance(each.circuit, each.order, each.covariance));
    if (!std::isfinite(offset) || !std::isfinite(u)) continue;
    laws.push_back({each.weight, offset, u});
    left -= each.weight;
  }
  if (laws.empty() || !(own > 0)) return 0;
  laws.push_back({left, 0, own});
  const auto outside = [&](double reach) {
    double sum = 0;
    for (const Law& law : laws) {
      const double u = std::fmax(law.u, 1e-3 * own);
      sum += law.weight * (normal_cdf((law.offset - reach) / u) + normal_cdf((-law.offset - reach) / u));
    }
    return sum;
  };
  double low = 0, high = kNormalQuantile * own;
  while (outside(high) > 0.05 && high < 1e6 * own) high *= 2;
  for (int k = 0; k < 50; ++k) {
    const double middle = (low + high) / 2;
    (outside(middle) > 0.05 ? low : high) = middle;
  }
  const double u = high / kNormalQuantile;
  return std::fmax(u * u - own * own, 0);
}

std::vector<ExtraTerm> choice_terms(const SweepModel& model, const std::vector<Item>& items, std::optional<double> f_r) {
  std::vector<ExtraTerm> terms;
  const auto add = [&](const std::string& symbol, double variance) {
    if (variance > 0) terms.push_back({symbol, "choice of the circuit", {ErrorLaw::Kind::normal, std::sqrt(variance), 0}, 'A', false, "data"});
  };
  for (const Item& item : items) {
    // A circuit without the element says that it is nothing.
    const double variance = variance_of_choice(
        model, [&](const Circuit& c) { return c[item.parameter]; },
        [&](const Circuit&, const std::vector<P>& order, const Eigen::MatrixXd& covariance) {
          const auto at = std::find(order.begin(), order.end(), item.parameter);
          const auto k = at - order.begin();
          return at == order.end() ? 0.0 : covariance(k, k);
        });
    const double value = model.fit.circuit[item.parameter];
    add(item.symbol, item.inverse ? variance / std::pow(value, 4) : variance);
  }
  if (f_r) {
    add("f_r", variance_of_choice(
                   model, [&](const Circuit& c) { return nearby_resonance_hz(c, *f_r); },
                   [&](const Circuit& c, const std::vector<P>&, const Eigen::MatrixXd& covariance) {
                     const std::vector<double> slopes = falling_zero_slopes(c, *f_r);
                     const Eigen::Map<const Eigen::VectorXd> d(slopes.data(), static_cast<Eigen::Index>(slopes.size()));
                     return d.dot(covariance * d);
                   }));
  }
  return terms;
}

/// Where the reactance changes sign outside the span, if the fitted circuit says so.
void add_resonance_bound(Measurement& result, const SweepModel& model, const SweepData& data) {
  const double at_top = impedance(model.fit.circuit, data.high_hz).imag(), at_bottom = impedance(model.fit.circuit, data.low_hz).imag();
  if (at_top > 0) {
    result.bounds.push_back({"f_r", Unit::hertz, data.high_hz, std::nullopt, 0.95});
  } else if (at_bottom < 0) {
    result.bounds.push_back({"f_r", Unit::hertz, std::nullopt, data.low_hz, 0.95});
  }
}

}  // namespace

std::vector<InputError> sweep_errors(const SweepModel& model) {
  std::vector<InputError> inputs;
  for (const ImpedanceErrorTerm& each : model.errors) {
    inputs.push_back({each.source, 0, each.law, each.kind, each.common, each.basis});
  }
  return inputs;
}

FittedInputs sweep_fitted(const SweepModel& model) {
  FittedInputs fitted;
  fitted.values = model.fit.fit.parameters;
  fitted.covariance = model.inflation * model.fit.fit.covariance;
  fitted.dof = model.points.scale_known ? 0 : model.fit.dof / model.inflation;
  return fitted;
}

double nearby_resonance_hz(const Circuit& circuit, double start_hz) {
  double f = start_hz;
  // By the susceptance: it crosses zero where the reactance does, but nearly straight, however narrow the resonance.
  for (int k = 0; k < 6; ++k) {
    const ImpedanceSlopes at = impedance_slopes(circuit, f);
    const std::complex<double> y = 1.0 / at.z, slope = -at.by_frequency * y * y;
    const double next = f - y.imag() / slope.imag();
    if (!(next > 0.5 * start_hz && next < 2 * start_hz)) return std::nan("");
    f = next;
  }
  return f;
}

void add_circuit(Measurement& result, const SweepModel& model, const SweepData& data, const SweepRequest& request) {
  const Circuit& circuit = model.fit.circuit;
  std::vector<Item> items;
  for (const Item& item : items_of(circuit.family)) {
    if (const CircuitLimit* limit = model.fit.limit_of(item.parameter)) {
      add_limit(result, model, item, *limit);
    } else {
      items.push_back(item);
    }
  }
  // Far from it the reactance may cross by nothing but the edge of the span.
  const std::optional<double> f_r = falling_zero_hz(circuit, data.low_hz, data.high_hz);
  std::vector<OutputSpec> outputs;
  for (const Item& item : items) outputs.push_back({item.symbol, item.inverse});
  if (f_r) outputs.push_back({"f_r"});
  const auto function = [&](std::span<const double> x, std::span<double> y) {
    const Circuit drawn = model.draw(x);
    for (std::size_t k = 0; k < items.size(); ++k) y[k] = drawn[items[k].parameter];
    if (f_r) y[items.size()] = nearby_resonance_hz(drawn, *f_r);
  };
  std::vector<ExtraTerm> extra = misfit_terms(model, items, f_r.value_or(std::nan("")), data.high_hz);
  for (ExtraTerm& each : choice_terms(model, items, f_r)) extra.push_back(std::move(each));
  // What folds back bends the sweep smoothly: neither noise nor residuals show it, and the narrowest features suffer most.
  const auto folded = std::find_if(result.findings.begin(), result.findings.end(),
                                   [](const Finding& finding) { return finding.code == "sharp_edges"; });
  if (folded != result.findings.end()) {
    if (f_r) {
      extra.push_back({"f_r", "fold at half the sample rate",
                       {ErrorLaw::Kind::rectangular, 0.5 * folded->figure * *f_r / std::sqrt(3.0), 0}, 'B', false, "data"});
    }
  }
  add_estimates(result, sweep_errors(model), sweep_fitted(model), outputs, function, extra, request.propagation);
  for (Estimate& each : result.estimates) {
    if (each.symbol != "R_ac") continue;
    each.at_hz = circuit.reference_hz;
    each.definition = circuit.family.skin ? "skin, (1+j) sqrt(f)" : "proximity, f^2";
  }
  if (!f_r) add_resonance_bound(result, model, data);
  withhold_unresolved(result);
  // Of a circuit that does not fit, residuals say nothing about what else might be there.
  if (model.misfit) return;
  for (const SweepModel::Hidden& each : model.hidden) add_hidden(result, each);
  if (folded != result.findings.end()) {
    std::erase_if(result.bounds, [](const Bound& bound) { return bound.symbol == "R_ac" || bound.symbol == "R_par"; });
  }
}

ModelSummary model_of(const SweepModel& model, const SweepData& data) {
  ModelSummary summary;
  summary.name = name(model.fit.circuit.family);
  for (std::size_t k = 0; k < model.fit.order.size(); ++k) {
    const P parameter = model.fit.order[k];
    const auto i = static_cast<Eigen::Index>(k);
    const bool seen = model.fit.seen(parameter);
    const double u = seen ? std::sqrt(model.inflation * model.fit.fit.covariance(i, i) + model.shifts.row(i).squaredNorm()) : std::nan("");
    summary.parameters[std::string(name(parameter))] = {model.fit.circuit[parameter], u, unit_of(parameter)};
  }
  summary.parameters["f_ref"] = {model.fit.circuit.reference_hz, std::nan(""), Unit::hertz};
  if (!model.runner_up.empty()) summary.runner_up = model.runner_up;
  summary.left_out = data.left_out;
  for (const std::size_t i : model.outliers) {
    summary.left_out.push_back(to_text(model.points.frequency_hz[i], Unit::hertz, Script::utf8, 4) + ": far off its neighbours");
  }
  summary.residual_rms = model.residual_rms;
  summary.reduced_chi_square = model.points.scale_known ? model.fit.fit.reduced_chi_square : std::nan("");
  summary.converged = model.fit.usable();
  return summary;
}

}  // namespace coilassay

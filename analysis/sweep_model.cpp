#include "analysis/sweep_model.h"

#include <algorithm>
#include <cmath>
#include <utility>

#include "base/number_text.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kHangTogether = 4.5;     // standard deviations of the lag-one correlation of white residuals
constexpr double kCounts = 2.5;           // from which a lag's correlation enters the inflation
constexpr std::size_t kMostLags = 40;
constexpr double kClearlyBetter = 10;     // log likelihood: e^10 to one

/// Log likelihood of errors alike in S less that of errors alike in ln Z, the fits being equally good descriptions.
double for_reflection(const CircuitFit& s, const CircuitFit& z, const CircuitData& data) {
  double jacobian = 0, n = 0;
  for (std::size_t i = 0; i < data.size(); ++i) {
    if (!s.used[i] || !z.used[i]) continue;
    // |d ln Z/dS| turns the density of ln Z into one of S.
    const Complex a = (data.z[i] + data.reference_ohm) * (data.z[i] + data.reference_ohm);
    jacobian += 2 * std::log(std::abs(a / (2 * data.reference_ohm * data.z[i])));
    n += 2;
  }
  const double in_s = -n / 2 * std::log(s.chi_square), in_z = -n / 2 * std::log(z.chi_square) + jacobian;
  return in_s - in_z;
}

/// Correlation over a lag, each part of the residual for itself.
double lag_correlation(const std::vector<Complex>& r, std::size_t lag) {
  double above = 0, below = 0;
  for (std::size_t i = 0; i < r.size(); ++i) {
    below += std::norm(r[i]);
    if (i + lag < r.size()) above += r[i].real() * r[i + lag].real() + r[i].imag() * r[i + lag].imag();
  }
  return below > 0 ? above / below : 0;
}

/// What the errors that were stated (not those taken by default) may do to each point, relative to |Z|.
std::vector<double> stated_errors(const SweepModel& model) {
  std::vector<double> all(model.points.size(), 0);
  for (const ImpedanceErrorTerm& each : model.errors) {
    if (each.basis.starts_with("default")) continue;
    for (std::size_t i = 0; i < all.size(); ++i) all[i] = std::hypot(all[i], std::abs(each.dz_ohm[i] / model.points.z[i]));
  }
  return all;
}

/// Errors that were told beforehand and turn out too small are as large as the residuals show.
void scale_by_chi_square(SweepModel& model) {
  if (model.points.scale_known && model.misfit) model.inflation = std::fmax(model.inflation, model.fit.fit.reduced_chi_square);
}

void judge_residuals(SweepModel& model) {
  std::vector<Complex> r;
  double relative = 0;
  for (std::size_t i = 0; i < model.fit.residual.size(); ++i) {
    if (!model.fit.used[i]) continue;
    Complex each = model.fit.residual[i];
    if (!model.fit.phase_used) each = each.real();
    r.push_back(each);
    const Complex z = model.points.z[i];
    const Complex ratio = impedance(model.fit.circuit, model.points.frequency_hz[i]) / z;
    const double off = model.fit.phase_used ? std::abs(ratio - 1.0) : std::abs(std::abs(ratio) - 1);
    relative += off * off;
  }
  const double parts = (model.fit.phase_used ? 2.0 : 1.0) * static_cast<double>(r.size());
  model.residual_rms = std::sqrt(relative / static_cast<double>(r.size()));
  // Fitting p parameters takes about p/parts from every lag.
  const double expected = -static_cast<double>(model.parameters()) / parts;
  model.correlation = lag_correlation(r, 1);
  model.misfit = (model.correlation - expected) * std::sqrt(parts) > kHangTogether;
  double sum = 0;
  for (std::size_t lag = 1; lag < std::min(kMostLags, r.size() / 3); ++lag) {
    const double c = lag_correlation(r, lag);
    if (c * std::sqrt(parts) < kCounts) break;
    sum += c;
  }
  model.inflation = 1 + 2 * sum;
  double stated = 0;
  for (std::size_t i = 0; i < model.stated.size(); ++i) stated += model.fit.used[i] ? model.stated[i] * model.stated[i] : 0;
  if (!model.misfit) return scale_by_chi_square(model);
  const double noise = noise_profile(model.fit).all;   // what is left between neighbours
  const double structure = model.residual_rms * std::sqrt(std::fmax(1 - noise * noise, 0));
  if (structure < std::sqrt(stated / static_cast<double>(r.size()))) {
    // The analyser may err by that much, and what its errors do to the circuit is carried on its own.
    model.misfit = false;
    model.inflation = std::fmin(noise * noise, 1);
    if (model.points.scale_known) model.inflation = 1;
    return;
  }
  scale_by_chi_square(model);
}

/// The lower and the upper two thirds of the span, the same family fitted to each.
void fit_parts(SweepModel& model, const SweepData& data) {
  const double step = std::log(data.high_hz / data.low_hz) / 3;
  for (const auto& [from, to] : {std::pair{0, 2}, std::pair{1, 3}}) {
    CircuitData part = model.points;
    for (std::size_t i = 0; i < part.size(); ++i) {
      const double at = std::log(part.frequency_hz[i] / data.low_hz) / step;
      const bool inside = at >= from - 1e-9 && at <= to + 1e-9 && model.fit.used[i];
      if (!inside) part.z[i] = std::nan("");
    }
    CircuitFitOptions options;
    options.reference_hz = model.fit.circuit.reference_hz;
    options.limits = false;
    if (Result<CircuitFit> fit = fit_circuit(part, model.fit.circuit.family, options)) {
      model.drift.parts.push_back(std::move(*fit));
    }
  }
}

/// The circuit with one more loss at the limit to which the data do not see it: what a value at one frequency cannot rule out.
void look_for_hidden_losses(SweepModel& model) {
  const CircuitFamily family = model.fit.circuit.family;
  const auto add = [&](CircuitFamily more, CircuitParameter loss) {
    CircuitFitOptions options;
    options.reference_hz = model.fit.circuit.reference_hz;
    const Result<CircuitFit> fit = fit_circuit(model.points, more, options);
    if (!fit) return;
    if (const CircuitLimit* limit = fit->limit_of(loss)) {
      model.hidden.push_back(limit->circuit);
    } else if (fit->seen(loss)) {
      // Seen, yet not worth its place: the criterion asks for more than two standard uncertainties.
      model.hidden.push_back(fit->circuit);
    }
  };
  if (!family.skin && !family.relaxation) {
    CircuitFamily more = family;
    more.skin = true;
    add(more, CircuitParameter::skin_resistance);
  }
  if (!family.parallel_loss) {
    CircuitFamily more = family;
    more.parallel_loss = true;
    add(more, CircuitParameter::parallel_conductance);
  }
}

void take_choice(SweepModel& model, CircuitChoice choice) {
  model.fit = std::move(choice.best);
  model.outliers = std::move(choice.left_out);
  model.runner_up.clear();
  if (choice.runner_up) {
    model.runner_up = name(choice.runner_up->family) + " (criterion " + to_text(choice.lead, Unit::one, Script::utf8, 3) + " higher)";
  }
}

/// The points weighted by how they scatter.
void weigh(SweepModel& model, const NoiseProfile& profile, bool has_phase) {
  model.points.u = profile.size;
  if (model.alike == SweepErrors::reflection) {
    for (std::size_t i = 0; i < profile.size.size(); ++i) {
      model.points.u[i] = std::sqrt((profile.size[i] * profile.size[i] + profile.angle[i] * profile.angle[i]) / 2);
    }
  } else if (has_phase) {
    model.points.u_phase = profile.angle;
  }
}

/// Circuits of one resonance.
std::vector<CircuitFamily> single_resonance() {
  std::vector<CircuitFamily> families;
  for (const bool loss : {false, true}) {
    families.push_back({.parallel_loss = loss});
    families.push_back({.parallel_loss = loss, .skin = true});
    families.push_back({.parallel_loss = loss, .relaxation = true});
  }
  return families;
}

/// Fits with the errors of the points as the file suggests, then as the residuals show, and keeps the circuit.
Result<void> choose(SweepModel& model, const SweepData& data, const CircuitChoiceOptions& options) {
  model.points = data.points;
  model.alike = data.scattering && !data.points.scale_known ? SweepErrors::reflection : SweepErrors::ratio;
  model.points.errors = model.alike;
  Result<CircuitChoice> choice = choose_circuit(model.points, options);
  if (!choice) return failure(choice);
  if (model.alike == SweepErrors::reflection) {
    CircuitData ratio = model.points;
    ratio.errors = SweepErrors::ratio;
    CircuitFitOptions again;
    again.reference_hz = options.reference_hz;
    again.start = choice->best.circuit;
    again.limits = false;
    const Result<CircuitFit> other = fit_circuit(ratio, choice->best.circuit.family, again);
    if (other && for_reflection(choice->best, *other, model.points) < -kClearlyBetter) {
      model.alike = SweepErrors::ratio;
      model.points = std::move(ratio);
      choice = choose_circuit(model.points, options);
      if (!choice) return failure(choice);
    }
  }
  if (!data.points.scale_known) {
    const NoiseProfile profile = noise_profile(choice->best);
    if (profile.uneven) {
      weigh(model, profile, data.has_phase);
      choice = choose_circuit(model.points, options);
      if (!choice) return failure(choice);
    }
  }
  if (!choice->best.usable()) {
    return failure(Problem::not_converged, "sweep", "the elements of no circuit are determined by this sweep",
                   "sweep over more decades, with more points, or with less noise");
  }
  take_choice(model, std::move(*choice));
  return {};
}

/// The choice once more with what the analyser may err as noise of each point: a structure that it can make is no element.
Result<void> choose_within_stated(SweepModel& model, const CircuitChoiceOptions& options) {
  const double noise = noise_profile(model.fit).all * model.fit.scale;
  const auto of = [](const std::vector<double>& u, std::size_t i) { return u.size() == 1 ? u[0] : u[i]; };
  std::vector<double> size, angle;
  for (std::size_t i = 0; i < model.points.size(); ++i) {
    double stated = model.stated[i] / std::sqrt(2.0);   // of each part
    if (model.alike == SweepErrors::reflection) {
      const Complex z = model.points.z[i], sum = z + model.points.reference_ohm;
      stated *= std::abs(2 * model.points.reference_ohm * z / (sum * sum));
    }
    size.push_back(std::hypot(of(model.points.u, i) * noise, stated));
    if (!model.points.u_phase.empty()) angle.push_back(std::hypot(of(model.points.u_phase, i) * noise, stated));
  }
  model.points.u = std::move(size);
  model.points.u_phase = std::move(angle);
  model.points.scale_known = true;
  Result<CircuitChoice> choice = choose_circuit(model.points, options);
  if (!choice) return failure(choice);
  take_choice(model, std::move(*choice));
  return {};
}

}  // namespace

Circuit SweepModel::draw(std::span<const double> x) const {
  Circuit circuit = fit.circuit;
  const auto count = static_cast<Eigen::Index>(parameters());
  const auto terms = static_cast<std::size_t>(shifts.cols());
  for (Eigen::Index k = 0; k < count; ++k) {
    double value = x[terms + static_cast<std::size_t>(k)];
    for (std::size_t e = 0; e < terms; ++e) value -= x[e] * shifts(k, static_cast<Eigen::Index>(e));
    circuit[fit.order[static_cast<std::size_t>(k)]] = value;
  }
  return circuit;
}

double round_reference_hz(double low_hz, double high_hz) {
  const double middle = std::log10(std::sqrt(low_hz * high_hz));
  const double decade = std::floor(middle);
  const double over = middle - decade;   // bounds half-way between 1, 2, 5, 10 on a logarithmic scale
  const double digit = over < 0.1505 ? 1 : over < 0.5 ? 2 : over < 0.8495 ? 5 : 10;
  return digit * std::pow(10.0, decade);
}

Result<SweepModel> fit_sweep(const SweepData& data, const SweepRequest& request) {
  SweepModel model;
  CircuitChoiceOptions options;
  options.reference_hz = round_reference_hz(data.low_hz, data.high_hz);
  const auto fit = [&]() -> Result<void> {
    if (auto chosen = choose(model, data, options); !chosen) return chosen;
    model.errors = data.errors;
    ImpedanceErrorTerm frequency = frequency_error(data, model.fit.circuit, request);
    if (!frequency.basis.empty()) model.errors.push_back(std::move(frequency));
    model.stated = stated_errors(model);
    judge_residuals(model);
    return {};
  };
  // Where an accuracy was stated, the small structure it allows is no second resonance: that is looked for only beyond it.
  const bool allowed = std::any_of(data.errors.begin(), data.errors.end(),
                                   [](const ImpedanceErrorTerm& each) { return !each.basis.starts_with("default"); });
  if (allowed) options.families = single_resonance();
  if (auto done = fit(); !done) return failure(done);
  if (allowed && !data.points.scale_known) {
    options.families.clear();
    if (auto done = choose_within_stated(model, options); !done) return failure(done);
    judge_residuals(model);
  }
  if (model.misfit) fit_parts(model, data);
  if (data.has_phase) {
    if (Result<KramersKronig> test = test_kramers_kronig(model.points)) model.causality = std::move(*test);
  }
  if (!request.at_hz.empty()) look_for_hidden_losses(model);
  model.shifts.resize(static_cast<Eigen::Index>(model.parameters()), static_cast<Eigen::Index>(model.errors.size()));
  for (std::size_t e = 0; e < model.errors.size(); ++e) {
    model.shifts.col(static_cast<Eigen::Index>(e)) = parameter_shift(model, model.errors[e].dz_ohm);
  }
  return model;
}

}  // namespace coilassay

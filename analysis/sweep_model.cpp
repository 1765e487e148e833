#include "analysis/sweep_model.h"

#include <algorithm>
#include <cmath>
#include <utility>

#include "analysis/sweep_joint.h"
#include "base/number_text.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kHangTogether = 4.5;     // standard deviations of the lag-one correlation of white residuals
constexpr double kCounts = 2.5;           // from which a lag's correlation enters the inflation
constexpr std::size_t kMostLags = 40;
constexpr double kNormalQuantile = 1.96;
constexpr double kFactorsBelow = 5;       // times the standard uncertainty by the errors of the bench
constexpr double kRefused = 10;           // of the criterion: a probability below 1 in 150
constexpr double kClearlyBetter = 10;     // log likelihood: e^10 to one
constexpr double kDigits = 1e-6;          // of a point: what its digits, and an analyser's, are good for at best

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

/// Errors that were told beforehand and turn out too small are as large as the residuals show.
void scale_by_chi_square(SweepModel& model) {
  if (model.points.scale_known && model.misfit) model.inflation = std::fmax(model.inflation, model.fit.fit.reduced_chi_square);
}

/// Standard uncertainty of the points by errors that were stated (not taken by default), r.m.s.: of ln Z, or of S.
double stated_accuracy(const SweepModel& model) {
  double sum = 0, count = 0;
  for (std::size_t i = 0; i < model.points.size(); ++i) {
    if (!model.fit.used[i]) continue;
    count += 1;
    for (const ImpedanceErrorTerm& each : model.errors) {
      if (each.basis.starts_with("default")) continue;
      const Complex z = model.points.z[i], sum_z = z + model.points.reference_ohm;
      const Complex by_z = model.alike == SweepErrors::reflection ? 2 * model.points.reference_ohm / (sum_z * sum_z) : 1.0 / z;
      sum += std::norm(each.dz_ohm[i] * by_z);
    }
  }
  return count > 0 ? std::sqrt(sum / count) : 0;
}

void judge_residuals(SweepModel& model) {
  std::vector<Complex> r;
  double relative = 0;
  for (std::size_t i = 0; i < model.fit.residual.size(); ++i) {
    if (!model.fit.used[i]) continue;
    Complex each = model.fit.residual[i];
    if (!model.fit.phase_used) each = each.real();
    r.push_back(each);
    const Complex clean = model.jointly ? model.cleaned[i] : model.points.z[i];
    const Complex ratio = impedance(model.fit.circuit, model.points.frequency_hz[i]) / clean;
    double off = model.fit.phase_used ? std::abs(ratio - 1.0) : std::abs(std::abs(ratio) - 1);
    if (model.alike == SweepErrors::reflection) {
      // Near an open or a short, Z itself is noise; S is what was measured.
      const double z0 = model.points.reference_ohm;
      off = std::abs(2 * z0 * clean * (ratio - 1.0) / ((ratio * clean + z0) * (clean + z0)));
    }
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
  model.noise = noise_profile(model.fit).all;
  if (!(model.noise > 0)) model.noise = 1;
  // What the analyser may err by its own data sheet is no fault of the circuit, however it is spread over frequency.
  if (model.misfit && model.residual_rms < std::fmax(stated_accuracy(model), kDigits)) {
    model.misfit = false;
    if (model.residual_rms < kDigits) model.inflation = 1;
  }
  scale_by_chi_square(model);
}

/// The lower and the upper two thirds of the span, the same family fitted to each.
void fit_parts(SweepModel& model, const SweepData& data) {
  const double step = std::log(data.high_hz / data.low_hz) / 3;
  for (const auto& [from, to] : {std::pair{0, 2}, std::pair{1, 3}}) {
    CircuitData part = model.points;
    if (model.jointly) part.z = model.cleaned;
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

/// The circuit with one element at the upper end of its interval, the others following as their covariance has it.
Circuit at_limit(const JointFit& joint, CircuitParameter element, double inflation) {
  const Eigen::MatrixXd all = inflation * joint.covariance + joint.shifts * joint.shifts.transpose();
  const auto at = std::find(joint.order.begin(), joint.order.end(), element) - joint.order.begin();
  Circuit circuit = joint.circuit;
  for (std::size_t k = 0; k < joint.order.size(); ++k) {
    const double moved = kNormalQuantile * all(static_cast<Eigen::Index>(k), at) / std::sqrt(all(at, at));
    circuit[joint.order[k]] = std::fmax(circuit[joint.order[k]] + moved, 0);
  }
  return circuit;
}

/// The circuit with one more loss at the limit to which the data do not see it: what a value at one frequency cannot rule out.
void look_for_hidden_losses(SweepModel& model) {
  const CircuitFamily family = model.fit.circuit.family;
  const auto add = [&](CircuitFamily more, CircuitParameter loss) {
    CircuitFitOptions options;
    options.reference_hz = model.fit.circuit.reference_hz;
    options.limits = !model.jointly;
    const Result<CircuitFit> fit = fit_circuit(model.points, more, options);
    if (!fit) return;
    if (model.jointly) {
      const JointFit joint = fit_jointly({model.points, model.fit.used, model.errors}, fit->circuit);
      if (joint.settled) model.hidden.push_back({loss, at_limit(joint, loss, model.inflation)});
      return;
    }
    if (const CircuitLimit* limit = fit->limit_of(loss)) {
      model.hidden.push_back({loss, limit->circuit});
    } else if (fit->seen(loss)) {
      // Seen, yet not worth its place: the criterion asks for more than two standard uncertainties.
      Circuit circuit = fit->circuit;
      circuit[loss] += kNormalQuantile * fit->standard_uncertainty(loss);
      model.hidden.push_back({loss, circuit});
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
  model.tried = std::move(choice.candidates);
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

/// Families for the joint choice: the usual ones, and of those with a second resonance or two laws what the first choice had.
std::vector<CircuitFamily> joint_families(const std::vector<CircuitCandidate>& tried) {
  std::vector<CircuitFamily> families;
  for (const bool loss : {false, true}) {
    families.push_back({.parallel_loss = loss});
    families.push_back({.parallel_loss = loss, .skin = true});
    families.push_back({.parallel_loss = loss, .relaxation = true});
  }
  for (const CircuitCandidate& each : tried) {
    const CircuitFamily& family = each.family;
    if (family.second_resonance || (family.skin && family.relaxation)) families.push_back(family);
  }
  return families;
}

/// The circuits that were tried and are not clearly refused, without errors of the bench.
void keep_alternatives(SweepModel& model) {
  CircuitData rest = model.points;
  for (const std::size_t i : model.outliers) rest.z[i] = std::nan("");
  CircuitFitOptions options;
  options.reference_hz = model.fit.circuit.reference_hz;
  options.limits = false;
  const auto best = std::min_element(model.tried.begin(), model.tried.end(), [](const CircuitCandidate& a, const CircuitCandidate& b) {
    return a.criterion < b.criterion;
  });
  for (const CircuitCandidate& each : model.tried) {
    const double lead = each.criterion - best->criterion;
    if (each.family == model.fit.circuit.family || lead >= kRefused) continue;
    const Result<CircuitFit> fit = fit_circuit(rest, each.family, options);
    if (fit && fit->usable()) model.alternatives.push_back({std::exp(-lead / 2), fit->circuit, fit->order, fit->fit.covariance});
  }
}

/// Weights that add up to one with that of the circuit chosen.
void share_weights(SweepModel& model) {
  double sum = 1;
  for (const SweepModel::Alternative& each : model.alternatives) sum += each.weight;
  for (SweepModel::Alternative& each : model.alternatives) each.weight /= sum;
}

/// Points with their noise as standard deviations: by differences of neighbouring residuals, and what the analyser's error may
/// differ from point to point.
CircuitData with_noise(const SweepModel& model, const SweepData& data) {
  CircuitData points = model.points;
  if (!points.scale_known) {
    const double noise = std::fmax(noise_profile(model.fit).all * model.fit.scale, 1e-300);
    for (double& u : points.u) u *= noise;
    for (double& u : points.u_phase) u *= noise;
    points.scale_known = true;
  }
  // However smooth a sweep looks: its digits end somewhere.
  for (double& u : points.u) u = std::hypot(u, kDigits);
  for (double& u : points.u_phase) u = std::hypot(u, kDigits);
  if (!(data.scatter_ratio > 0) && !(data.scatter_s > 0)) return points;
  if (points.u.size() == 1) points.u.assign(points.size(), points.u.front());
  if (points.u_phase.size() == 1) points.u_phase.assign(points.size(), points.u_phase.front());
  for (std::size_t i = 0; i < points.size(); ++i) {
    const Complex z = points.z[i], sum = z + points.reference_ohm;
    const double s_by_ratio = std::abs(2 * points.reference_ohm * z / (sum * sum));
    const bool reflection = model.alike == SweepErrors::reflection;
    const double own = reflection ? std::hypot(data.scatter_s, data.scatter_ratio * s_by_ratio)
                                  : std::hypot(data.scatter_ratio, data.scatter_s / s_by_ratio);
    points.u[i] = std::hypot(points.u[i], own);
    if (!points.u_phase.empty()) points.u_phase[i] = std::hypot(points.u_phase[i], own);
  }
  return points;
}

/// The choice once more, together with the errors the points share: what those can do to the points is no element.
void choose_jointly(SweepModel& model, const SweepData& data) {
  if (model.errors.empty()) return;
  const CircuitData points = with_noise(model, data);
  const JointProblem problem{points, model.fit.used, model.errors};
  CircuitData rest = points;
  for (const std::size_t i : model.outliers) rest.z[i] = std::nan("");
  struct Tried {
    CircuitFit fit;
    JointFit joint;
    double criterion;
  };
  std::vector<Tried> tried;
  for (const CircuitFamily& family : joint_families(model.tried)) {
    CircuitFitOptions options;
    options.reference_hz = model.fit.circuit.reference_hz;
    options.limits = false;
    Result<CircuitFit> fit = fit_circuit(rest, family, options);
    if (!fit) continue;
    JointFit joint = fit_jointly(problem, fit->circuit);
    if (!joint.settled) continue;
    const double count = joint.dof + static_cast<double>(joint.order.size());
    const double criterion = joint.chi_square + static_cast<double>(joint.order.size()) * std::log(count);
    tried.push_back({std::move(*fit), std::move(joint), criterion});
  }
  if (tried.empty()) return;
  std::stable_sort(tried.begin(), tried.end(), [](const Tried& a, const Tried& b) { return a.criterion < b.criterion; });
  for (std::size_t k = 1; k < tried.size(); ++k) {
    const double lead = tried[k].criterion - tried[0].criterion;
    const JointFit& other = tried[k].joint;
    if (lead >= kRefused) continue;
    model.alternatives.push_back({std::exp(-lead / 2), other.circuit, other.order, other.covariance + other.shifts * other.shifts.transpose()});
  }
  JointFit& joint = tried.front().joint;
  model.fit = std::move(tried.front().fit);
  model.fit.circuit = joint.circuit;
  model.fit.order = joint.order;
  for (std::size_t k = 0; k < joint.order.size(); ++k) model.fit.fit.parameters[static_cast<Eigen::Index>(k)] = joint.circuit[joint.order[k]];
  model.fit.fit.covariance = joint.covariance;
  model.fit.fit.stop = FitStop::converged;
  model.fit.residual = joint.residual;
  model.fit.chi_square = joint.chi_square;
  model.fit.dof = joint.dof;
  model.fit.fit.reduced_chi_square = joint.chi_square / joint.dof;
  model.fit.scale = 1;
  model.fit.limits.clear();
  model.shifts = joint.shifts;
  model.points = points;
  model.cleaned = without_errors(problem, joint);
  model.jointly = true;
  model.runner_up.clear();
  if (tried.size() > 1) {
    model.runner_up = name(tried[1].joint.circuit.family) + " (criterion " +
                      to_text(tried[1].criterion - tried[0].criterion, Unit::one, Script::utf8, 3) + " higher)";
  }
}

}  // namespace

Circuit SweepModel::draw(std::span<const double> x) const {
  Circuit circuit = fit.circuit;
  const auto count = static_cast<Eigen::Index>(parameters());
  const auto terms = static_cast<std::size_t>(shifts.cols());
  for (Eigen::Index k = 0; k < count; ++k) {
    const CircuitParameter name = fit.order[static_cast<std::size_t>(k)];
    double moved = 0;
    for (std::size_t e = 0; e < terms; ++e) moved += x[e] * shifts(k, static_cast<Eigen::Index>(e));
    // A gain that is off makes L larger and C smaller by the same factor, and leaves the resonance where it is: small shifts are
    // factors. An element that may as well not be there is moved by the shift itself.
    const double best = fit.circuit[name], value = x[terms + static_cast<std::size_t>(k)];
    const bool small = best > kFactorsBelow * shifts.row(k).norm();
    circuit[name] = small ? value * std::exp(-moved / best) : value - moved;
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
  if (auto chosen = choose(model, data, options); !chosen) return failure(chosen);
  model.errors = data.errors;
  ImpedanceErrorTerm frequency = frequency_error(data, model.fit.circuit, request);
  if (!frequency.basis.empty()) model.errors.push_back(std::move(frequency));
  choose_jointly(model, data);
  if (!model.jointly) keep_alternatives(model);
  share_weights(model);
  judge_residuals(model);
  if (model.misfit) fit_parts(model, data);
  if (data.has_phase) {
    CircuitData points = model.points;
    if (model.jointly) {
      points.z = model.cleaned;
      points.scale_known = data.points.scale_known;
    }
    if (Result<KramersKronig> test = test_kramers_kronig(points, model.fit.circuit)) model.causality = std::move(*test);
  }
  look_for_hidden_losses(model);
  if (!model.jointly) {
    model.shifts = Eigen::MatrixXd::Zero(static_cast<Eigen::Index>(model.parameters()), static_cast<Eigen::Index>(model.errors.size()));
    for (std::size_t e = 0; e < model.errors.size(); ++e) {
      model.shifts.col(static_cast<Eigen::Index>(e)) = parameter_shift(model, model.errors[e].dz_ohm);
    }
  }
  return model;
}

}  // namespace coilassay

// Apparent values of a swept coil at the frequencies asked for: by the model, and as the nearest point has them.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/sweep_result.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kNormalQuantile = 1.96;
constexpr double kAtTheEdge = 1.001;   // a frequency typed with few digits is still the last one of the span

std::vector<OutputSpec> apparent_outputs(double f) {
  return {{"Z", false, f},   {"phi", false, f}, {"L_s", false, f}, {"R_s", false, f},
          {"L_p", false, f}, {"R_p", true, f},  {"Q", true, f},    {"D", false, f}};
}

void apparent_values(Complex z, double f, std::span<double> y) {
  const double w = kTwoPi * f, r = z.real(), x = z.imag();
  y[0] = std::abs(z);
  const bool coil = x > 0;
  y[1] = std::arg(z);
  y[2] = coil ? x / w : std::nan("");
  y[3] = r;
  y[4] = coil ? std::norm(z) / (x * w) : std::nan("");
  y[5] = r / std::norm(z);
  y[6] = y[7] = r / std::fabs(x);
}

/// A loss that its uncertainty hides is no value.
void withhold_hidden(std::vector<Estimate>& estimates) {
  const auto hidden = [&](const Estimate& e) {
    return (e.symbol == "R_s" || e.symbol == "D") && !(e.quantity.value > e.quantity.standard_uncertainty);
  };
  std::erase_if(estimates, hidden);
}

Point finished(Measurement part, double f, const char* from) {
  Point point;
  point.at_hz = f;
  point.estimates = std::move(part.estimates);
  withhold_hidden(point.estimates);
  point.from = from;
  return point;
}

/// What a loss too small to be seen could change, one term for each quantity.
std::vector<ExtraTerm> hidden_terms(const SweepModel& model, double f, const std::vector<OutputSpec>& outputs) {
  std::vector<double> best(outputs.size()), other(outputs.size());
  apparent_values(impedance(model.fit.circuit, f), f, best);
  const auto value = [&](const std::vector<double>& y, std::size_t k) { return outputs[k].reciprocal ? 1 / y[k] : y[k]; };
  std::vector<ExtraTerm> terms;
  for (std::size_t k = 0; k < outputs.size(); ++k) {
    double most = 0;
    for (const SweepModel::Hidden& hidden : model.hidden) {
      apparent_values(impedance(hidden.circuit, f), f, other);
      const double moved = std::fabs(value(other, k) - value(best, k));
      most = std::isfinite(moved) ? std::fmax(most, moved) : most;
    }
    if (most > 0) terms.push_back({outputs[k].symbol, "loss not seen", {ErrorLaw::Kind::normal, most / kNormalQuantile, 0}, 'A', false, "data"});
  }
  return terms;
}

Point by_model(const SweepModel& model, double f, const SweepRequest& request) {
  const std::vector<OutputSpec> outputs = apparent_outputs(f);
  Measurement part;
  const auto function = [&](std::span<const double> x, std::span<double> y) { apparent_values(impedance(model.draw(x), f), f, y); };
  add_estimates(part, sweep_errors(model), sweep_fitted(model), outputs, function, hidden_terms(model, f, outputs), request.propagation);
  return finished(std::move(part), f, "model");
}

/// Covariance of the real and the imaginary part of a measured impedance, by what the fit found its points to scatter.
Eigen::Matrix2d scatter_of(const SweepModel& model, std::size_t i) {
  const CircuitData& points = model.points;
  const Complex z = points.z[i];
  const double u = (points.u.size() == 1 ? points.u[0] : points.u[i]) * model.fit.scale;
  if (model.alike == SweepErrors::reflection) {
    const double by_s = std::norm(z + points.reference_ohm) / (2 * points.reference_ohm);
    return Eigen::Matrix2d::Identity() * (u * by_s) * (u * by_s);
  }
  double u_angle = u;
  if (!points.u_phase.empty()) u_angle = (points.u_phase.size() == 1 ? points.u_phase[0] : points.u_phase[i]) * model.fit.scale;
  Eigen::Matrix2d turn;
  turn << z.real() * u, -z.imag() * u_angle, z.imag() * u, z.real() * u_angle;
  return turn * turn.transpose();
}

Point by_data(const SweepModel& model, double f, const SweepRequest& request) {
  std::size_t nearest = model.points.size();
  const auto distance = [&](std::size_t i) { return std::fabs(std::log(model.points.frequency_hz[i] / f)); };
  for (std::size_t i = 0; i < model.points.size(); ++i) {
    if (model.fit.used[i] && (nearest == model.points.size() || distance(i) < distance(nearest))) nearest = i;
  }
  const Complex z = model.points.z[nearest];
  const double at = model.points.frequency_hz[nearest];
  FittedInputs measured;
  measured.source = "noise";
  measured.values = Eigen::Vector2d(z.real(), z.imag());
  measured.covariance = scatter_of(model, nearest);
  measured.dof = model.points.scale_known ? 0 : model.fit.dof;
  const std::size_t terms = model.errors.size();
  const auto function = [&](std::span<const double> x, std::span<double> y) {
    Complex drawn(x[terms], x[terms + 1]);
    for (std::size_t e = 0; e < terms; ++e) drawn -= x[e] * model.errors[e].dz_ohm[nearest];
    apparent_values(drawn, at, y);
  };
  Measurement part;
  add_estimates(part, sweep_errors(model), measured, apparent_outputs(at), function, {}, request.propagation);
  return finished(std::move(part), at, "data");
}

}  // namespace

void add_points(Measurement& result, const SweepModel& model, const SweepData& data, const SweepRequest& request) {
  for (const double f : request.at_hz) {
    if (f < data.low_hz / kAtTheEdge || f > data.high_hz * kAtTheEdge) {
      result.findings.push_back({"outside_span", Severity::caution,
                                 "nothing is said at " + to_text(f, Unit::hertz, Script::utf8, 4) + ": the sweep goes from " +
                                     to_text(data.low_hz, Unit::hertz, Script::utf8, 4) + " to " + to_text(data.high_hz, Unit::hertz, Script::utf8, 4),
                                 "frequency", f, Unit::hertz});
      continue;
    }
    result.points.push_back(by_model(model, f, request));
    // Of a point whose angle nobody measured there is nothing to compare.
    if (data.has_phase) result.points.push_back(by_data(model, f, request));
  }
}

}  // namespace coilassay

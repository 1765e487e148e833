// From the outputs of the curves to estimates with their budgets.
#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

#include "analysis/ramp_result.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

using namespace ramp_output;

constexpr std::array kSymbolOf = {"L_0",   "I_sat_10", "I_sat_20", "I_sat_30", "I_sat_10_secant", "I_sat_20_secant",
                                  "I_sat_30_secant", "E_max"};

/// Mean over the pulses that count.
struct Combined {
  Eigen::VectorXd values, spread, pulse_u;   // pulse_u: of the mean, from the scatter of the pulses beyond their noise
  Eigen::MatrixXd covariance, sensitivity;
  std::size_t pulses = 0;
};

Combined combine(const RampStory& story) {
  Combined all;
  const std::size_t first = story.first_counted();
  all.pulses = story.curves.size() - first;
  const auto n = static_cast<double>(all.pulses);
  all.values = Eigen::VectorXd::Zero(kCount);
  all.spread = Eigen::VectorXd::Zero(kCount);
  all.pulse_u = Eigen::VectorXd::Zero(kCount);
  all.covariance = Eigen::MatrixXd::Zero(kCount, kCount);
  all.sensitivity = Eigen::MatrixXd::Zero(kCount, static_cast<Eigen::Index>(story.inputs.errors.size()));
  for (std::size_t p = first; p < story.curves.size(); ++p) {
    const RampCurve& curve = story.curves[p];
    all.values += curve.values / n;   // a NaN of one pulse stays: it was not reached every time
    all.covariance += curve.covariance / (n * n);
    all.sensitivity += curve.sensitivity / n;
    all.spread = all.spread.cwiseMax(curve.spread);
  }
  if (all.pulses > 1) {
    for (Eigen::Index o = 0; o < kCount; ++o) {
      double square = 0;
      for (std::size_t p = first; p < story.curves.size(); ++p) {
        const double d = story.curves[p].values[o] - all.values[o];
        square += d * d / (n - 1);
      }
      const double beyond = square / n - all.covariance(o, o);
      if (beyond > 0) all.pulse_u[o] = std::sqrt(beyond);
    }
  }
  return all;
}

void add_bounds(Measurement& result, const RampStory& story, const Combined& all) {
  // A curve that does not follow the samples sets no limits: finding model_misfit says so.
  const RampCurve& shown = story.shown();
  if (shown.fit.lack_of_fit > ramp_defaults::kHopelessMisfit && shown.late_inductance_ratio < 0.9) return;
  // The highest current seen, by the lower end of what its scale allows.
  const double gain_u = story.inputs.errors[1].law.standard_uncertainty;
  const double noise_u = story.shown().fit.fit.residual_rms;
  double lowest = story.curves.back().high_a;
  for (std::size_t p = story.first_counted(); p < story.curves.size(); ++p) lowest = std::fmin(lowest, story.curves[p].high_a);
  const std::array laws = {ErrorLaw{story.inputs.errors[1].law.kind, gain_u * lowest, 0},
                           ErrorLaw{ErrorLaw::Kind::normal, noise_u, 0}};
  const double u = std::hypot(gain_u * lowest, noise_u);
  const double highest = lowest - coverage_factor(laws) * u;
  for (int o = kSat; o < kEnergy; ++o) {
    if (!std::isfinite(all.values[o])) {
      // The mean inductance falls later than the incremental one.
      double seen = highest;
      for (std::size_t p = story.first_counted(); p < story.curves.size() && o < kSecant; ++p) {
        seen = std::fmin(seen, story.curves[p].sure_a[static_cast<std::size_t>(o - kSat)]);
      }
      result.bounds.push_back({kSymbolOf[static_cast<std::size_t>(o)], Unit::ampere, seen, std::nullopt, 0.95});
    }
  }
}

/// Winding resistance from the closure: both gains act on it.
void add_resistance(Measurement& result, const RampStory& story) {
  if (story.resistance.from != RampResistance::From::closure) return;
  const std::vector<InputError> gains = {story.inputs.errors[0], story.inputs.errors[1]};
  FittedInputs fitted;
  fitted.source = "closure of the flux";
  fitted.values = Eigen::VectorXd::Constant(1, story.resistance.closure_ohm);
  fitted.covariance = Eigen::MatrixXd::Constant(1, 1, std::pow(story.resistance.closure_u_ohm, 2));
  const auto f = [&](std::span<const double> x, std::span<double> y) { y[0] = x[2] * x[0] / x[1]; };
  if (story.resistance.closure_ohm > 2 * story.resistance.closure_u_ohm) {
    add_estimates(result, gains, fitted, {{"R_dc"}}, f, {}, story.request->propagation);
  } else {
    result.bounds.push_back({"R_dc", Unit::ohm, std::nullopt,
                             std::fmax(story.resistance.closure_ohm, 0) + 1.96 * story.resistance.closure_u_ohm, 0.95});
  }
}

}  // namespace

bool knee_is_refused(const RampStory& story) {
  const RampCurve& curve = story.shown();
  // A coil whose inductance grows towards the peak and has not fallen anywhere.
  const double u = std::sqrt(curve.covariance(kGrid + kGridPoints - 1, kGrid + kGridPoints - 1)) / curve.values[kL0];
  return !std::isfinite(curve.values[kSat]) && curve.late_inductance_ratio > 1.05 + 2 * u &&
         curve.late_slope < 0.98 * curve.early_slope;
}

void add_ramp_estimates(Measurement& result, const RampStory& story) {
  const Combined all = combine(story);
  const bool refused = knee_is_refused(story);
  std::vector<int> reported;
  std::vector<OutputSpec> outputs;
  std::vector<ExtraTerm> extra;
  for (int o = 0; o <= kEnergy; ++o) {
    const bool knee = o >= kSat && o < kEnergy;
    if (!std::isfinite(all.values[o]) || (knee && refused)) continue;
    const std::string symbol = kSymbolOf[static_cast<std::size_t>(o)];
    reported.push_back(o);
    outputs.push_back({symbol});
    if (all.spread[o] > 0) {
      extra.push_back({symbol, "choice of the curve", {ErrorLaw::Kind::rectangular, all.spread[o] / std::sqrt(3.0), 0}, 'A',
                       false, "data: curves that fit as well"});
    }
    if (all.pulse_u[o] > 0) {
      extra.push_back({symbol, "spread of the pulses",
                       {ErrorLaw::Kind::student_t, all.pulse_u[o], static_cast<double>(all.pulses - 1)}, 'A', false, "data"});
    }
  }
  // The drive may have lasted up to a sample longer than its last sample.
  const RampCurve& shown = story.shown();
  extra.push_back({"E_max", "sampling of the edges",
                   {ErrorLaw::Kind::rectangular,
                    shown.high_a * shown.late_inner_v * story.layout.step_s / std::sqrt(3.0), 0},
                   'A', false, "data"});
  const auto count = static_cast<Eigen::Index>(reported.size());
  FittedInputs fitted;
  fitted.values.resize(count);
  fitted.covariance.resize(count, count);
  for (Eigen::Index a = 0; a < count; ++a) {
    fitted.values[a] = all.values[reported[static_cast<std::size_t>(a)]];
    for (Eigen::Index b = 0; b < count; ++b) {
      fitted.covariance(a, b) = all.covariance(reported[static_cast<std::size_t>(a)], reported[static_cast<std::size_t>(b)]);
    }
  }
  const std::vector<InputError>& errors = story.inputs.errors;
  const auto f = [&](std::span<const double> x, std::span<double> y) {
    for (std::size_t o = 0; o < y.size(); ++o) {
      y[o] = x[errors.size() + o];
      for (std::size_t j = 0; j < errors.size(); ++j) {
        y[o] += all.sensitivity(reported[o], static_cast<Eigen::Index>(j)) * (x[j] - errors[j].value);
      }
    }
  };
  add_estimates(result, errors, fitted, outputs, f, extra, story.request->propagation);
  for (Estimate& estimate : result.estimates) {
    if (estimate.symbol.starts_with("I_sat")) {
      estimate.definition = estimate.symbol.ends_with("secant") ? "ramp_secant" : "ramp_incremental";
    }
    if (story.shown().reference_a > 0 && estimate.symbol != "E_max") estimate.reference_a = story.shown().reference_a;
    if (estimate.symbol == "E_max") estimate.at_a = story.shown().high_a;
  }
  if (!refused) add_bounds(result, story, all);
  add_resistance(result, story);
}

void add_ramp_curve(Measurement& result, const RampStory& story) {
  const RampCurve& curve = story.shown();
  Table table{"curve",
              {{"current_A", Unit::ampere, {}},
               {"incremental_H", Unit::henry, {}},
               {"incremental_U_H", Unit::henry, {}},
               {"secant_H", Unit::henry, {}},
               {"flux_Wb", Unit::weber, {}}}};
  const double reference_flux = curve.curve().integral(curve.reference_a);
  for (int g = 0; g < kGridPoints; ++g) {
    const double i = curve.grid_a[static_cast<std::size_t>(g)];
    const Eigen::Index o = kGrid + g;
    std::vector<ErrorLaw> laws = {{ErrorLaw::Kind::normal, std::sqrt(std::fmax(curve.covariance(o, o), 0)), 0},
                                  {ErrorLaw::Kind::rectangular, curve.spread[o] / std::sqrt(3.0), 0}};
    for (std::size_t j = 0; j < story.inputs.errors.size(); ++j) {
      ErrorLaw law = story.inputs.errors[j].law;
      law.standard_uncertainty *= std::fabs(curve.sensitivity(o, static_cast<Eigen::Index>(j)));
      laws.push_back(law);
    }
    double variance = 0;
    for (const ErrorLaw& law : laws) variance += law.standard_uncertainty * law.standard_uncertainty;
    const double flux = curve.curve().integral(i);
    table.columns[0].values.push_back(i);
    table.columns[1].values.push_back(curve.values[o]);
    table.columns[2].values.push_back(coverage_factor(laws) * std::sqrt(variance));
    table.columns[3].values.push_back(i > 0 ? flux / i : curve.values[o]);
    table.columns[4].values.push_back(flux);
  }
  if (curve.reference_a > 0) {
    // Below the reference nothing was seen: flux counts from there, and there is no ratio to the current.
    for (double& flux : table.columns[4].values) flux -= reference_flux;
    std::fill(table.columns[3].values.begin(), table.columns[3].values.end(), std::nan(""));
  }
  result.tables.push_back(std::move(table));
}

void add_ramp_pulses(Measurement& result, const RampStory& story) {
  if (story.curves.size() < 2) return;
  for (std::size_t p = 0; p < story.curves.size(); ++p) {
    const RampCurve& curve = story.curves[p];
    Point point;
    point.index = p + 1;
    for (int o = 0; o < kSecant; ++o) {
      if (!std::isfinite(curve.values[o])) continue;
      // What tells pulses apart: their own noise, without the errors they share.
      const double u = std::hypot(std::sqrt(std::fmax(curve.covariance(o, o), 0)), curve.spread[o] / std::sqrt(3.0));
      Estimate estimate;
      estimate.symbol = kSymbolOf[static_cast<std::size_t>(o)];
      estimate.quantity = {curve.values[o], u, o == kL0 ? Unit::henry : Unit::ampere};
      estimate.k = 1.96;
      estimate.low = curve.values[o] - 1.96 * u;
      estimate.high = curve.values[o] + 1.96 * u;
      if (o != kL0) estimate.definition = "ramp_incremental";
      point.estimates.push_back(std::move(estimate));
    }
    result.pulses.push_back(std::move(point));
  }
}

void add_loop(Measurement& result, const RampStory& story) {
  const std::size_t p = story.first_counted();
  const RampPulse& pulse = story.layout.pulses[p];
  if (!pulse.returns || !story.layout.zero_known || story.resistance.from == RampResistance::From::unknown) return;
  const std::vector<double>&v = story.layout.volts, &i = story.layout.amps;
  const double dt = story.layout.step_s;
  const std::size_t first = story.integrals[p].first;
  double vi = 0, ii = 0, vslope = 0, vv = 0, largest_jump = 0;
  for (std::size_t k = first + 1; k + 1 < std::min(pulse.end, v.size()); ++k) {
    vi += v[k] * i[k] * dt;
    ii += i[k] * i[k] * dt;
    vv += v[k] * v[k] * dt;
    vslope += v[k] * (i[k + 1] - i[k - 1]) / 2;
    largest_jump = std::fmax(largest_jump, std::fabs(v[k + 1] - v[k]) * std::fabs(i[k]));
  }
  const double charge = story.integrals[p].charge.back(), flux = story.integrals[p].volt_seconds.back();
  const RampInputs& inputs = story.inputs;
  const double r = inputs.errors[2].value;
  std::vector<InputError> errors = {inputs.errors[0], inputs.errors[1], inputs.errors[2], inputs.errors[3], inputs.errors[4],
                                    inputs.errors[7]};
  InputError zero = inputs.errors[7];
  zero.source = "zero of the current";
  zero.law = {ErrorLaw::Kind::normal, story.layout.amp_zero_u, 0};
  InputError edges = zero;
  edges.source = "sampling of the edges";
  edges.law = {ErrorLaw::Kind::rectangular, largest_jump * dt / std::sqrt(12.0), 0};
  errors.push_back(zero);
  errors.push_back(edges);
  for (std::size_t j = 5; j < errors.size(); ++j) errors[j].value = 0;
  const double skew = errors[3].value, tau = errors[4].value;
  const double noise = std::sqrt((story.layout.amp_noise * story.layout.amp_noise * vv +
                                  story.layout.volt_noise * story.layout.volt_noise * ii) * dt);
  FittedInputs fitted;
  fitted.source = "noise";
  fitted.values = Eigen::VectorXd::Zero(1);
  fitted.covariance = Eigen::MatrixXd::Constant(1, 1, noise * noise);
  const auto f = [&](std::span<const double> x, std::span<double> y) {
    y[0] = x[0] * x[1] * vi - x[2] * x[1] * x[1] * ii + (x[3] - skew - (x[4] - tau)) * vslope - x[5] * charge -
           x[6] * (flux - 2 * r * charge) + x[7] + x[8];
  };
  Measurement own;
  add_estimates(own, errors, fitted, {{"W_loop"}}, f, {}, story.request->propagation);
  const Estimate* loop = own.find("W_loop");
  if (loop == nullptr) return;
  if (loop->low > 0) {
    result.estimates.push_back(*loop);
    result.budget["W_loop"] = own.budget["W_loop"];
  } else if (loop->high > 0) {
    result.bounds.push_back({"W_loop", Unit::joule, std::nullopt, loop->high, 0.95});
  }
}

}  // namespace coilassay

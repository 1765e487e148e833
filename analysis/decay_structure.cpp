#include "analysis/decay_structure.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "base/number_text.h"
#include "fitting/spectrum.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr double kImprobable = 1e-6;
// A line among M bins of white noise stands above ln(M) + 14 times the mean once in a million records.
constexpr double kLineAboveLog = 14;
constexpr std::size_t kSpectrumLength = 8192;
constexpr double kSecondModeCounts = 0.005;   // of the first mode: below, it moves nothing that matters
// A rectangular law whose middle 95 % still reach what was seen, with something for the bend of the line.
constexpr double kBeyondSeen = 1.15;
constexpr double kStrongSecondMode = 0.03;    // above, single-mode values are not to be trusted

std::vector<double> residual_of(std::span<const double> y, const DampedSine& model) {
  std::vector<double> r(y.size());
  evaluate(model, 0, r);
  for (std::size_t i = 0; i < r.size(); ++i) r[i] = y[i] - r[i];
  return r;
}

/// Amplitude of the strongest line in the first part of the residuals, 0 when none stands out.
double residual_line(std::span<const double> y, const DampedSine& model, double resolution) {
  std::size_t length = std::min(y.size(), kSpectrumLength);
  const std::vector<double> r = residual_of(y.first(length), model);
  if (length < 64 || std::any_of(r.begin(), r.end(), [](double v) { return std::isnan(v); })) return 0;
  const std::vector<double> power = power_spectrum(r);
  const std::size_t skip = 1;  // the mean is taken out
  double strongest = 0, total = 0;
  for (std::size_t k = skip; k < power.size(); ++k) {
    strongest = std::max(strongest, power[k]);
    total += power[k];
  }
  const double mean = (total - strongest) / static_cast<double>(power.size() - skip - 1);
  if (!(mean > 0) || strongest < mean * (std::log(static_cast<double>(power.size())) + kLineAboveLog)) return 0;
  const double amplitude = 2 * std::sqrt(strongest) / static_cast<double>(length);
  const double codes = std::isnan(resolution) ? 0 : resolution;
  return amplitude > 0.35 * codes ? amplitude : 0;
}

double amplitude_of(const DampedSine& m) { return m.q > 0 ? m.envelope(0) : std::fabs(m.p); }

struct TwoModes {
  std::optional<TwoModeFit> fit;
  DecayResiduals residuals;
};

/// The joint fit, looked at with both modes taken out.
TwoModes try_two_modes(std::span<const double> y, double resolution) {
  TwoModes result;
  Result<TwoModeFit> fit = fit_two_damped_sines(y, {resolution});
  if (!fit || fit->fit.covariance.size() == 0 || !(fit->second.q > 0) || !(fit->first.q > 0)) return result;
  std::vector<double> second(y.size());
  DampedSine alone = fit->second;
  alone.c = 0;
  evaluate(alone, 0, second);
  for (std::size_t i = 0; i < second.size(); ++i) second[i] = y[i] - second[i];
  result.residuals = look_at_residuals(second, fit->first, resolution);
  result.fit = std::move(*fit);
  return result;
}

std::vector<DecayWindowPoint> fit_along(std::span<const double> y, const DampedSine& whole, double sigma, double resolution) {
  std::vector<DecayWindowPoint> points;
  const double tau = whole.a > 0 ? 1 / whole.a : static_cast<double>(y.size());
  const double amplitude = amplitude_of(whole);
  // Down to where the envelope meets the noise of one period.
  const double period = whole.q > 0 ? 2 * std::numbers::pi / std::sqrt(whole.q) : tau;
  const double noise = sigma / std::sqrt(std::fmax(period / 2, 1));
  const double visible = tau * std::log(std::fmax(amplitude / std::fmax(3 * noise, 1e-300), 1.5));
  const auto usable = static_cast<std::size_t>(std::fmin(static_cast<double>(y.size()), visible));
  constexpr std::size_t kWindows = 4;
  const std::size_t length = usable / kWindows;
  if (length < 16 || static_cast<double>(length) < 1.5 * period) return points;
  for (std::size_t k = 0; k < kWindows; ++k) {
    const Result<DampedSineFit> fit = fit_damped_sine(y.subspan(k * length, length), {resolution});
    if (!fit || fit->fit.covariance.size() == 0 || !(fit->model.q > 0)) continue;
    points.push_back({fit->model.envelope(static_cast<double>(length) / 2), fit->model.a, fit->fit.standard_uncertainty(0),
                      fit->model.q, fit->fit.standard_uncertainty(1)});
  }
  return points;
}

/// How a quantity moves along the windows: chance of it by noise, the widest distance from the whole fit, and where a
/// straight line in the square of the amplitude (the first term of any even level dependence) leads at zero level.
struct Spread {
  double chance = 1, widest = 0, first = 0, last = 0, at_rest = 0;
};
template <class Value, class Uncertainty>
Spread spread_of(const std::vector<DecayWindowPoint>& points, double about, Value value, Uncertainty uncertainty) {
  Spread s;
  if (points.size() < 2) return s;
  double w = 0, wx = 0, wy = 0, wxx = 0, wxy = 0;
  for (const auto& p : points) {
    const double weight = 1 / (uncertainty(p) * uncertainty(p));
    const double x = p.amplitude * p.amplitude;
    w += weight;
    wx += weight * x;
    wy += weight * value(p);
    wxx += weight * x * x;
    wxy += weight * x * value(p);
  }
  const double mean = wy / w;
  const double slope = (w * wxy - wx * wy) / (w * wxx - wx * wx);
  s.at_rest = mean - slope * wx / w;
  double chi = 0;
  for (const auto& p : points) {
    const double z = (value(p) - mean) / uncertainty(p);
    chi += z * z;
    // Where a window itself is uncertain, its own noise is not the spread.
    s.widest = std::fmax(s.widest, std::fabs(value(p) - about) - uncertainty(p));
  }
  s.widest = std::fmax(s.widest, std::fabs(s.at_rest - about));
  s.first = value(points.front());
  s.last = value(points.back());
  const auto dof = static_cast<double>(points.size() - 1);
  s.chance = f_upper_tail(chi / dof, dof, 1e6);
  return s;
}

}  // namespace

DecayStructure look_at_structure(std::span<const double> window, const Decay& decay, double resolution,
                                 double sample_interval_s) {
  DecayStructure structure;
  const DampedSine& model = decay.fit.model;
  const double line = residual_line(window, model, resolution);
  const bool misfit = decay.residuals.chance < kImprobable;
  if (line == 0 && !misfit) return structure;

  const double amplitude = amplitude_of(model);
  TwoModes two = try_two_modes(window, resolution);
  if (two.fit) {
    const double share = amplitude_of(two.fit->second) / amplitude_of(two.fit->first);
    const bool explains = two.residuals.chance > kImprobable ||
                          two.residuals.lack_of_fit < 0.01 * decay.residuals.lack_of_fit ||
                          (!misfit && two.residuals.sigma < decay.residuals.sigma);
    // Two modes closer than their decay, or too close to beat within the window, describe any slow change of frequency as
    // well: that is level dependence.
    const double distance = std::fabs(std::sqrt(two.fit->second.q) - std::sqrt(two.fit->first.q));
    const bool apart = distance > 0.5 * std::fmax(two.fit->first.a, two.fit->second.a) &&
                       distance * static_cast<double>(window.size()) > 3;
    if (explains && apart && share > kSecondModeCounts) {
      structure.second_share = share;
      const double f2 = std::sqrt(two.fit->second.q) / (2 * std::numbers::pi * sample_interval_s);
      structure.findings.push_back(
          {"second_mode", share > kStrongSecondMode ? Severity::caution : Severity::note,
           "a second mode at " + to_text(f2, Unit::hertz) + " rings with " + to_percent_text(share) +
               " of the first; both were fitted together, the values are those of the first. Look for a second winding, a "
               "loosely coupled coil nearby, or a long lead",
           "", share, Unit::one});
      // Two coupled resonators: the stronger mode lies off the lone one by the splitting times share/(1 + share).
      const double w1 = std::sqrt(two.fit->first.q);
      structure.spread_q = 2 * w1 * distance * share * share / (1 + share * share);
      if (two.residuals.chance < kImprobable) {
        // Two modes are not the whole story either: what is left may act on either parameter.
        const double relative = two.residuals.misfit_amplitude / std::fmax(amplitude, 1e-300);
        structure.spread_a += two.fit->first.a * std::fmin(2 * relative, 1);
        structure.spread_q += 2 * w1 * two.fit->first.a * relative;
      }
      structure.modes = std::move(two.fit);
      return structure;
    }
  }

  structure.windows = fit_along(window, model, decay.residuals.sigma, resolution);
  const Spread q = spread_of(
      structure.windows, model.q, [](const auto& p) { return p.q; }, [](const auto& p) { return p.u_q; });
  const Spread a = spread_of(
      structure.windows, model.a, [](const auto& p) { return p.a; }, [](const auto& p) { return p.u_a; });
  const bool q_moves = q.chance < 1e-4;
  const bool a_moves = a.chance < 1e-4;
  if (q_moves) {
    structure.spread_q = kBeyondSeen * q.widest;
    const double ratio = std::sqrt(q.last / q.first) - 1;
    structure.findings.push_back(
        {"level_dependent", Severity::caution,
         "the frequency changes by " + to_percent_text(ratio) + " while the amplitude falls from " +
             to_text(structure.windows.front().amplitude, Unit::volt, Script::utf8, 3) + " to " +
             to_text(structure.windows.back().amplitude, Unit::volt, Script::utf8, 3) +
             ": the inductance depends on the level; at zero level the frequency would be about " +
             to_text(std::sqrt(std::fmax(q.at_rest, 0)) / (2 * std::numbers::pi * sample_interval_s), Unit::hertz) +
             ", and the interval covers that and what was seen. Release from a smaller current for the small-signal value",
         "f_0", ratio, Unit::one});
  }
  if (a_moves) {
    structure.spread_a = kBeyondSeen * a.widest;
    const double ratio = a.last / a.first;
    structure.findings.push_back(
        {"not_one_exponential", Severity::caution,
         "the decay is not one exponential: its rate at the end is " + to_text(ratio, Unit::one, Script::utf8, 3) +
             " times that at the start, as core loss or a diode across the coil makes it; the interval of R_s and Q covers "
             "what was seen",
         "alpha", ratio, Unit::one});
  }
  if (structure.findings.empty() && misfit) {
    // Something unexplained is left: half of it may act on either parameter.
    const double relative = decay.residuals.misfit_amplitude / std::fmax(amplitude, 1e-300);
    structure.spread_a = model.a * std::fmin(2 * relative, 1);
    structure.spread_q = 2 * std::sqrt(std::fmax(model.q, 0)) * model.a * relative;
    structure.findings.push_back(
        {"not_one_exponential", Severity::caution,
         "something that is not one decaying sine is left in the record (" + to_percent_text(relative) +
             " of the amplitude); the intervals are wider for it. Look at the residuals in --figure",
         "", relative, Unit::one});
  }
  return structure;
}

}  // namespace coilassay

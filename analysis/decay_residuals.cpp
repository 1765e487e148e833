#include "analysis/decay_residuals.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <complex>
#include <numbers>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr std::size_t kStretches = 32;
constexpr std::size_t kPointsPerStretch = 48;

/// model(n0), model(n0 + stride), ... by a complex recurrence; libm only where there is no oscillation.
std::vector<double> residuals_at(std::span<const double> y, const DampedSine& model, std::size_t n0, std::size_t stride,
                                 std::size_t count) {
  std::vector<double> r(count);
  if (model.q > 0) {
    const double w = std::sqrt(model.q);
    const auto at = static_cast<double>(n0);
    const auto step = static_cast<double>(stride);
    std::complex<double> z = std::complex<double>(model.p, -model.s / w) * std::exp(std::complex<double>(-model.a, w) * at);
    const std::complex<double> turn = std::exp(std::complex<double>(-model.a, w) * step);
    for (std::size_t i = 0; i < count; ++i) {
      r[i] = y[n0 + i * stride] - (z.real() + model.c);
      z *= turn;
    }
  } else {
    for (std::size_t i = 0; i < count; ++i) r[i] = y[n0 + i * stride] - model(static_cast<double>(n0 + i * stride));
  }
  return r;
}

struct Split {
  double in_band = 0, outside = 0;  // sums of squares
  double in_dof = 0, out_dof = 0;
};

/// Splits residuals into the part along {1, cos wx, sin wx} or {1, x} and the rest, by orthonormalising the basis on the
/// samples that are present.
Split split(const std::vector<double>& r, double w_per_point) {
  std::array<std::vector<double>, 3> basis;
  const std::size_t dimensions = w_per_point > 0 ? 3 : 2;
  for (std::size_t i = 0; i < r.size(); ++i) {
    const auto x = static_cast<double>(i);
    const bool present = !std::isnan(r[i]);
    basis[0].push_back(present ? 1 : 0);
    if (w_per_point > 0) {
      basis[1].push_back(present ? std::cos(w_per_point * x) : 0);
      basis[2].push_back(present ? std::sin(w_per_point * x) : 0);
    } else {
      basis[1].push_back(present ? x - static_cast<double>(r.size() - 1) / 2 : 0);
    }
  }
  Split result;
  double present = 0;
  for (const double value : r) {
    if (std::isnan(value)) continue;
    result.outside += value * value;
    present += 1;
  }
  for (std::size_t d = 0; d < dimensions; ++d) {
    for (std::size_t e = 0; e < d; ++e) {
      double dot = 0;
      for (std::size_t i = 0; i < r.size(); ++i) dot += basis[d][i] * basis[e][i];
      for (std::size_t i = 0; i < r.size(); ++i) basis[d][i] -= dot * basis[e][i];
    }
    double norm = 0;
    for (const double b : basis[d]) norm += b * b;
    if (norm < 1e-9) {
      std::fill(basis[d].begin(), basis[d].end(), 0.0);
      continue;
    }
    double projection = 0;
    for (std::size_t i = 0; i < r.size(); ++i) {
      basis[d][i] /= std::sqrt(norm);
      if (!std::isnan(r[i])) projection += basis[d][i] * r[i];
    }
    result.in_band += projection * projection;
    result.outside -= projection * projection;
    result.in_dof += 1;
  }
  result.outside = std::max(result.outside, 0.0);
  result.out_dof = present - result.in_dof;
  return result;
}

/// A fast exponential left at the start shows as residuals that hang together there; matched filters of several lengths,
/// each on at most some thousand samples.
double early_sign(std::span<const double> y, const DampedSine& model, double sigma) {
  if (!(sigma > 0)) return 0;
  const double tau = model.a > 0 ? 1 / model.a : static_cast<double>(y.size());
  double strongest = 0;
  for (double length = 2; length <= std::fmax(0.1 * tau, 2); length *= 3.5) {
    const auto reach = static_cast<std::size_t>(std::fmin(7 * length, static_cast<double>(y.size())));
    const std::size_t stride = reach / 2048 + 1;
    const double m = length / static_cast<double>(stride);
    const std::vector<double> r = residuals_at(y, model, 0, stride, reach / stride);
    double dot = 0, norm = 0;
    for (std::size_t i = 0; i < r.size(); ++i) {
      if (std::isnan(r[i])) continue;
      const double weight = std::exp(-static_cast<double>(i) / m);
      dot += weight * r[i];
      norm += weight * weight;
    }
    if (norm > 0) strongest = std::max(strongest, std::fabs(dot) / (sigma * std::sqrt(norm)));
  }
  return strongest;
}

}  // namespace

DecayResiduals look_at_residuals(std::span<const double> y, const DampedSine& model, double resolution) {
  DecayResiduals result;
  const std::size_t n = y.size();
  const double w = model.damped_omega();
  const double cycles = w * static_cast<double>(n) / (2 * std::numbers::pi);
  const bool oscillates = cycles >= 8;

  // One and a half periods a stretch where it oscillates; shorter than the whole otherwise.
  std::size_t length = oscillates ? static_cast<std::size_t>(std::ceil(3 * std::numbers::pi / w)) : n / kStretches;
  length = std::clamp<std::size_t>(length, 8, std::max<std::size_t>(n / 2, 8));
  const std::size_t stretches = std::clamp<std::size_t>(n / length, 1, kStretches);
  const std::size_t stride = std::max<std::size_t>(1, length / kPointsPerStretch);
  std::size_t count = length / stride;
  if (oscillates) count = std::max<std::size_t>(count, 12);  // at few samples a period the stretch is longer
  count = std::min(count, (n - 1) / stride + 1);

  double in_band = 0, outside = 0, in_dof = 0, out_dof = 0;
  const std::size_t span = (count - 1) * stride + 1;
  for (std::size_t k = 0; k < stretches; ++k) {
    const std::size_t at = stretches > 1 ? k * (n - span) / (stretches - 1) : 0;
    const Split part = split(residuals_at(y, model, at, stride, count), oscillates ? w * static_cast<double>(stride) : 0);
    if (part.out_dof < 2) continue;
    in_band += part.in_band;
    outside += part.outside;
    in_dof += part.in_dof;
    out_dof += part.out_dof;
    result.position.push_back(at);
    result.energy.push_back(part.in_band / part.in_dof);
  }
  // The fit has taken up to five directions out of the in-band part.
  in_dof = std::max(in_dof - 5, 1.0);
  if (out_dof < 4) return result;
  const double noise = outside / out_dof;
  result.sigma = std::sqrt(noise);
  const double floor = std::isnan(resolution) ? 0 : resolution * resolution / 12;
  const double reference = std::max(noise, floor);
  for (double& energy : result.energy) energy = reference > 0 ? energy / reference : 0;
  const double excess = in_band / in_dof - reference;
  // A sine of amplitude A has mean square A^2/2 spread over the points of a stretch and lands in two of its directions.
  result.misfit_amplitude = excess > 0 ? std::sqrt(2 * excess * in_dof / (out_dof + in_dof)) : 0;
  if (reference > 0) {
    result.lack_of_fit = in_band / in_dof / reference;
    result.chance = f_upper_tail(result.lack_of_fit, in_dof, out_dof);
    const double codes = std::isnan(resolution) ? 0 : resolution;
    if (result.misfit_amplitude < codes / 3) result.chance = 1;  // the quantiser's own structure
  }

  const double limit = 5 * std::max(result.sigma, std::isnan(resolution) ? 0 : resolution / 2);
  const std::size_t head = std::min<std::size_t>(n, 64);
  const std::vector<double> first = residuals_at(y, model, 0, 1, head);
  for (std::size_t i = 0; i < head; ++i) {
    if (std::fabs(first[i]) > limit && limit > 0) result.bad_head = i + 1;
  }
  result.early_z = early_sign(y, model, std::max(result.sigma, std::isnan(resolution) ? 0 : resolution / std::sqrt(12.0)));
  return result;
}

}  // namespace coilassay

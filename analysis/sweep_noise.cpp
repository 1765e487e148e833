// How the errors of a sweep's points compare, and what a common error of the points does to the fitted circuit.
#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>

#include "analysis/sweep_model.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr std::size_t kSegments = 8;
constexpr std::size_t kFewestPerSegment = 8;
constexpr double kByChance = 1e-4;
constexpr double kSmallest = 1e-3;   // of the whole: quantised or constant stretches show no scatter at all

/// Sum of squares and number of independent differences of one part within a segment.
struct Spread {
  double squares = 0, count = 0;
  double variance() const { return count > 0 ? squares / count : 0; }
};

/// Whether variances differ beyond chance (Bartlett's test); differences of neighbours share a point, so that n of them
/// carry about two thirds of n degrees of freedom.
bool differ(const std::vector<Spread>& spreads) {
  double dof = 0, pooled = 0, logs = 0, inverse = 0, groups = 0;
  for (const Spread& each : spreads) {
    const double nu = each.count * 2 / 3;
    if (!(nu > 1) || !(each.variance() > 0)) continue;
    dof += nu;
    pooled += nu * each.variance();
    logs += nu * std::log(each.variance());
    inverse += 1 / nu;
    groups += 1;
  }
  if (groups < 2) return false;
  const double statistic = (dof * std::log(pooled / dof) - logs) / (1 + (inverse - 1 / dof) / (3 * (groups - 1)));
  return statistic > chi_square_quantile(1 - kByChance, groups - 1);
}

/// Standard deviation at a place between the middles of segments, by straight lines in its logarithm.
double between(const std::vector<double>& of_segment, double place) {
  const double at = std::clamp(place - 0.5, 0.0, static_cast<double>(of_segment.size() - 1));
  const auto k = std::min(static_cast<std::size_t>(at), of_segment.size() - 1);
  const std::size_t next = std::min(k + 1, of_segment.size() - 1);
  const double t = at - static_cast<double>(k);
  return std::exp((1 - t) * std::log(of_segment[k]) + t * std::log(of_segment[next]));
}

}  // namespace

NoiseProfile noise_profile(const CircuitFit& fit) {
  NoiseProfile profile;
  std::vector<Complex> r;
  std::vector<std::size_t> at;
  for (std::size_t i = 0; i < fit.residual.size(); ++i) {
    if (fit.used[i]) {
      r.push_back(fit.residual[i]);
      at.push_back(i);
    }
  }
  const std::size_t segments = std::min(kSegments, r.size() / kFewestPerSegment);
  if (segments < 2) return profile;
  std::vector<Spread> size(segments), angle(segments);
  Spread all_size, all_angle;
  for (std::size_t i = 0; i + 1 < r.size(); ++i) {
    const Complex d = (r[i + 1] - r[i]) / std::sqrt(2.0);
    const std::size_t s = std::min(i * segments / r.size(), segments - 1);
    size[s].squares += d.real() * d.real();
    angle[s].squares += d.imag() * d.imag();
    size[s].count += 1;
    angle[s].count += 1;
    all_size.squares += d.real() * d.real();
    all_angle.squares += d.imag() * d.imag();
    all_size.count += 1;
    all_angle.count += 1;
  }
  const double all = fit.phase_used ? std::sqrt((all_size.variance() + all_angle.variance()) / 2) : std::sqrt(all_size.variance());
  profile.all = all;
  if (!(all > 0)) return profile;
  const bool parts_differ = fit.phase_used && differ({all_size, all_angle});
  const bool along = differ(size) || (fit.phase_used && differ(angle));
  profile.uneven = parts_differ || along;
  if (!profile.uneven) return profile;
  std::vector<double> size_u(segments), angle_u(segments);
  for (std::size_t s = 0; s < segments; ++s) {
    double v = along ? size[s].variance() : all_size.variance(), w = along ? angle[s].variance() : all_angle.variance();
    if (!parts_differ && fit.phase_used) v = w = (v + w) / 2;
    size_u[s] = std::fmax(std::sqrt(v), kSmallest * all);
    angle_u[s] = std::fmax(std::sqrt(w), kSmallest * all);
  }
  profile.size.assign(fit.residual.size(), all);
  profile.angle.assign(fit.residual.size(), all);
  for (std::size_t i = 0; i < r.size(); ++i) {
    const double place = static_cast<double>(i * segments) / static_cast<double>(r.size());
    profile.size[at[i]] = between(size_u, place);
    profile.angle[at[i]] = between(angle_u, place);
  }
  return profile;
}

Eigen::VectorXd parameter_shift(const SweepModel& model, std::span<const Complex> dz_ohm) {
  const auto count = static_cast<Eigen::Index>(model.parameters());
  const CircuitData& points = model.points;
  Eigen::MatrixXd normal = Eigen::MatrixXd::Zero(count, count);
  Eigen::VectorXd right = Eigen::VectorXd::Zero(count);
  for (std::size_t i = 0; i < points.size(); ++i) {
    if (!model.fit.used[i]) continue;
    const ImpedanceSlopes slopes = impedance_slopes(model.fit.circuit, points.frequency_hz[i]);
    const double u = points.u.size() == 1 ? points.u[0] : points.u[i];
    double u_angle = u;
    if (!points.u_phase.empty()) u_angle = points.u_phase.size() == 1 ? points.u_phase[0] : points.u_phase[i];
    Complex by_z = 1.0 / slopes.z;
    if (model.alike == SweepErrors::reflection) {
      by_z = 2 * points.reference_ohm / ((slopes.z + points.reference_ohm) * (slopes.z + points.reference_ohm));
      u_angle = u;
    }
    Eigen::VectorXd size(count), angle(count);
    for (Eigen::Index k = 0; k < count; ++k) {
      const Complex slope = slopes.by_parameter[static_cast<std::size_t>(k)] * by_z;
      size[k] = slope.real() / u;
      angle[k] = slope.imag() / u_angle;
    }
    // Of sizes alone, z is the size: the error is relative to what was measured.
    const Complex moved = model.alike == SweepErrors::ratio ? dz_ohm[i] / points.z[i] : dz_ohm[i] * by_z;
    normal += size * size.transpose() + angle * angle.transpose();
    right += size * (moved.real() / u) + angle * (moved.imag() / u_angle);
  }
  // The parameters differ by many orders of magnitude: equal diagonal first.
  const Eigen::VectorXd unit = normal.diagonal().cwiseMax(1e-300).cwiseSqrt().cwiseInverse();
  const Eigen::MatrixXd scaled = unit.asDiagonal() * normal * unit.asDiagonal();
  Eigen::VectorXd shift = unit.asDiagonal() * scaled.ldlt().solve(unit.asDiagonal() * right);
  for (double& each : shift) each = std::isfinite(each) ? each : 0;
  return shift;
}

}  // namespace coilassay

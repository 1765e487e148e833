#include "analysis/resistance_line.h"

#include <Eigen/Core>
#include <algorithm>
#include <cmath>
#include <utility>

#include "fitting/statistics.h"
#include "fitting/straight_line.h"

namespace coilassay {

namespace {

constexpr double kCurrentOff = 0.05;         // of the largest current: below, the current counts as switched off
constexpr std::size_t kFewestToWeigh = 8;    // readings of a polarity that show its own scatter
constexpr double kUnlikeScatter = 1e-3;      // probability by chance below which the polarities weigh differently
constexpr double kDriftByChance = 5e-4;      // one-sided
constexpr std::size_t kFewestForDrift = 6;

/// The readings as matrices: V = V_th + R I + D t I, without V_th for one polarity, without D unless drifting.
struct Equations {
  Eigen::MatrixXd x, z;
  Eigen::VectorXd y, weights;
  Eigen::Index resistance = 0;   // its column; the drift is the next one
};

Eigen::VectorXd order_about_its_middle(const ResistanceReadings& readings) {
  const double first = readings.order.front(), last = readings.order.back();
  Eigen::VectorXd t(static_cast<Eigen::Index>(readings.size()));
  for (Eigen::Index i = 0; i < t.size(); ++i) {
    t[i] = last > first ? (readings.order[static_cast<std::size_t>(i)] - first) / (last - first) - 0.5 : 0;
  }
  return t;
}

Equations equations_of(const ResistanceReadings& readings, const ResistanceLine& line, const Eigen::VectorXd& weights,
                       bool drifting) {
  const auto n = static_cast<Eigen::Index>(readings.size());
  const Eigen::Map<const Eigen::VectorXd> volts(readings.volts.data(), n), amps(readings.amps.data(), n);
  Equations e;
  e.resistance = line.both_sides ? 1 : 0;
  e.x.resize(n, e.resistance + (drifting ? 2 : 1));
  if (line.both_sides) e.x.col(0).setOnes();
  e.x.col(e.resistance) = amps;
  e.z = e.x;
  for (Eigen::Index i = 0; i < n; ++i) e.z(i, e.resistance) = line.side[static_cast<std::size_t>(i)];
  if (drifting) {
    const Eigen::VectorXd t = order_about_its_middle(readings);
    e.x.col(e.resistance + 1) = t.cwiseProduct(amps);
    e.z.col(e.resistance + 1) = t.cwiseProduct(e.z.col(e.resistance));
  }
  e.y = volts;
  e.weights = weights;
  return e;
}

LinearFit solved(const Equations& e) { return fit_by_instruments(e.x, e.z, e.y, e.weights); }

/// Smallest scatter that the last digit lets through unseen.
double hidden_scatter(const ResistanceReadings& readings, double resistance) {
  const double volts = std::isfinite(readings.volt_step) ? readings.volt_step : 0;
  const double amps = std::isfinite(readings.amp_step) ? readings.amp_step : 0;
  return std::hypot(volts, resistance * amps) / std::sqrt(12.0);
}

/// Readings weigh by the scatter of their polarity where the scatters differ beyond chance.
Eigen::VectorXd weights_of(const ResistanceLine& line, const LinearFit& fit, double hidden) {
  Eigen::VectorXd weights = Eigen::VectorXd::Ones(fit.residuals.size());
  double square[2] = {0, 0};
  std::size_t count[2] = {0, 0};
  for (Eigen::Index i = 0; i < fit.residuals.size(); ++i) {
    const int side = line.side[static_cast<std::size_t>(i)];
    if (side == 0) continue;
    square[side > 0] += fit.residuals[i] * fit.residuals[i];
    ++count[side > 0];
  }
  if (count[0] < kFewestToWeigh || count[1] < kFewestToWeigh || !(square[0] > 0) || !(square[1] > 0)) return weights;
  const double dof[2] = {static_cast<double>(count[0] - 1), static_cast<double>(count[1] - 1)};
  const double variance[2] = {square[0] / dof[0] + hidden * hidden, square[1] / dof[1] + hidden * hidden};
  const int larger = variance[1] > variance[0];
  if (f_upper_tail(variance[larger] / variance[1 - larger], dof[larger], dof[1 - larger]) > kUnlikeScatter) return weights;
  // Relative to the quieter side; readings with the current off count like the noisier one.
  for (Eigen::Index i = 0; i < weights.size(); ++i) {
    const int side = line.side[static_cast<std::size_t>(i)];
    const bool quiet = side != 0 && (side > 0) != (larger == 1);
    weights[i] = quiet ? 1 : variance[1 - larger] / variance[larger];
  }
  return weights;
}

/// Residuals that hang together make means less certain than so many readings would.
double correlation_factor(const LinearFit& fit) {
  const auto n = static_cast<double>(fit.residuals.size());
  const double r = lag_one_correlation({fit.residuals.data(), static_cast<std::size_t>(fit.residuals.size())});
  if (n < 20 || !(r > 2.5 / std::sqrt(n))) return 1;
  return std::sqrt((1 + std::fmin(r, 0.98)) / (1 - std::fmin(r, 0.98)));
}

/// How far the resistance at either end lies off that of the middle: the mean of the first (last) readings, carried on to the
/// very first (last) by their distance from the readings next to them, for a winding warms fastest at first.
double end_deviation(const ResistanceReadings& readings, const ResistanceLine& line) {
  const std::size_t n = readings.size();
  const std::size_t block = std::max<std::size_t>(3, n / 8);
  const auto mean_of = [&](std::size_t first, std::size_t end) {
    double volts = 0, amps = 0;
    for (std::size_t i = first; i < end; ++i) {
      const double offset = line.both_sides ? line.offset_v : 0;
      volts += line.side[i] * (readings.volts[i] - offset);
      amps += line.side[i] * readings.amps[i];
    }
    return amps > 0 ? volts / amps : line.resistance_ohm;
  };
  if (n < 2 * block) return 0;
  const double half_a_block = static_cast<double>(block - 1) / static_cast<double>(2 * block);
  const double first = mean_of(0, block), second = mean_of(block, 2 * block);
  const double last = mean_of(n - block, n), before = mean_of(n - 2 * block, n - block);
  return std::fmax(std::fabs(first + half_a_block * (first - second) - line.resistance_ohm),
                   std::fabs(last + half_a_block * (last - before) - line.resistance_ohm));
}

bool take_sides(const ResistanceReadings& readings, ResistanceLine& line) {
  double largest = 0;
  for (const double i : readings.amps) largest = std::fmax(largest, std::fabs(i));
  if (!(largest > 0)) return false;
  std::size_t count[3] = {0, 0, 0};
  double sum[3] = {0, 0, 0};
  for (const double i : readings.amps) {
    const int side = i > kCurrentOff * largest ? 1 : i < -kCurrentOff * largest ? -1 : 0;
    line.side.push_back(side);
    ++count[side + 1];
    sum[side + 1] += i;
  }
  const auto mean = [&](int side) { return count[side + 1] > 0 ? sum[side + 1] / static_cast<double>(count[side + 1]) : 0; };
  line.both_sides = (count[0] > 0) + (count[1] > 0) + (count[2] > 0) > 1;
  const double span = mean(1) - mean(-1);
  line.half_swing_a = count[0] > 0 && count[2] > 0 ? span / 2 : std::fabs(span);
  return true;
}

}  // namespace

ResistanceLine fit_resistance(const ResistanceReadings& readings) {
  ResistanceLine line;
  const std::size_t n = readings.size();
  if (n > 0 && !take_sides(readings, line)) {
    line.story = ResistanceLine::Story::no_current;
    return line;
  }
  line.needed = line.both_sides ? 3 : 2;
  if (n < line.needed) return line;

  const Eigen::VectorXd equal = Eigen::VectorXd::Ones(static_cast<Eigen::Index>(n));
  Equations equations = equations_of(readings, line, equal, false);
  LinearFit fit = solved(equations);
  if (!fit.usable()) {
    line.story = ResistanceLine::Story::no_current;
    return line;
  }
  const Eigen::Index r = equations.resistance;
  const double hidden = hidden_scatter(readings, fit.parameters[r]);
  const Eigen::VectorXd weights = weights_of(line, fit, hidden);
  equations.weights = weights;
  if (LinearFit weighted = solved(equations); weighted.usable()) fit = std::move(weighted);

  if (n >= kFewestForDrift) {
    const LinearFit drifting = solved(equations_of(readings, line, weights, true));
    if (drifting.usable() && drifting.dof >= 3) {
      const double change = drifting.parameters[r + 1];
      const double deviation = std::hypot(drifting.residual_deviation, hidden);
      const double u = drifting.standard_uncertainty(r + 1, deviation) * correlation_factor(drifting);
      if (std::fabs(change) > student_t_quantile(1 - kDriftByChance, drifting.dof) * u) {
        line.drifts = true;
        line.drift_ratio = change / drifting.parameters[r];
        fit = drifting;
      }
    }
  }
  line.story = ResistanceLine::Story::measured;
  line.resistance_ohm = fit.parameters[r];
  line.residual_v = fit.residual_deviation;
  line.dof = fit.dof;
  const double widened = fit.residual_deviation * correlation_factor(fit);
  line.u_ohm = fit.standard_uncertainty(r, widened);
  if (line.both_sides) {
    line.offset_v = fit.parameters[0];
    line.u_offset_v = fit.standard_uncertainty(0, widened);
  }
  if (line.drifts) {
    // 95 % of a rectangular law are to hold both ends, with a tenth for what curves between the readings.
    line.drift_half_width_ohm = std::fmax(std::fabs(fit.parameters[r + 1]) / 2, end_deviation(readings, line)) * 1.1 / 0.95;
  }
  return line;
}

}  // namespace coilassay

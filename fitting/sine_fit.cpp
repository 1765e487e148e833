#include "fitting/sine_fit.h"

#include <fmt/format.h>

#include <Eigen/Cholesky>
#include <algorithm>
#include <cassert>
#include <cmath>
#include <numbers>
#include <optional>
#include <utility>

#include "fitting/blocks.h"
#include "fitting/damped_sine_plan.h"
#include "fitting/damped_sine_start.h"
#include "fitting/rounding.h"
#include "fitting/sine_blocks.h"
#include "fitting/sine_harmonics.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;

constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr std::size_t kFewest = 16;
constexpr double kFewCycles = 8;        // below: frequencies are tried one by one on plain sums
constexpr double kLeastCycles = 0.7;
constexpr double kUndithered = 0.45;    // scatter in steps; as for damped sines
constexpr double kPlain = 1e4;          // strength of a line over its floor at which no other channel need be asked
constexpr double kClearHarmonic = 5;    // in standard uncertainties: taken out before the fundamental is fitted

struct Start {
  double omega = 0;
  double error = 0;      // scale of its error
};

struct Channel {
  WhiteBlocks blocks;
  SineSolution solution;
  double weight = 1;     // 1 / sigma^2
  double reference = 0;
};

double mean_of(std::span<const double> y) {
  const PresentSum head = present_sum(y.first(std::min<std::size_t>(y.size(), 4096)), 0);
  return head.count > 0 ? head.sum / static_cast<double>(head.count) : 0;
}

/// The line of the first channel in which it is plain, else of the one in which it stands out most.
Start strongest_line(std::span<const SineChannel> channels) {
  Start best;
  double most = 0;
  for (const SineChannel& channel : channels) {
    const StrongestLine line = find_beginning(channel.y).line;
    const double clearness = line.strength / std::max(line.floor, 1e-30 * line.strength);
    if (!(clearness > most)) continue;
    most = clearness;
    best = {line.omega, std::max(line.omega_error, 0.3 * kTwoPi / static_cast<double>(line.length))};
    if (clearness > kPlain) break;
  }
  return best;
}

/// Weights from what is left over in each channel; never from less than rounding of doubles leaves.
void weigh(Channel& channel) {
  const double values = static_cast<double>(channel.blocks.values_used());
  const double floor = 1e-13 * (std::abs(channel.solution.phasor()) + std::fabs(channel.solution.linear[2]) +
                                std::fabs(channel.reference));
  const double variance = channel.solution.chi_square / std::max(1.0, values - 4) + floor * floor;
  channel.weight = variance > 0 ? 1 / variance : 0;
}

double solve_all(std::vector<Channel>& channels, double omega, double centre, bool with_slope) {
  double objective = 0;
  for (Channel& c : channels) {
    c.solution = solve_sine(c.blocks, omega, centre, with_slope);
    if (!c.solution.solvable) return INFINITY;
    objective += c.weight * c.solution.chi_square;
  }
  return objective;
}

/// Frequencies from half a cycle to a dozen per record tried one by one, on coarse plain sums.
double scanned_omega(std::span<const SineChannel> inputs, double centre) {
  std::vector<Channel> channels;
  const double n = static_cast<double>(inputs.front().y.size());
  for (const SineChannel& input : inputs) {
    Channel c;
    c.reference = mean_of(input.y);
    Plan plan = plan_with_length(input.y.size(), input.y.size(), n / 160, 0);
    c.blocks = compress(input.y, plan, c.reference);
    c.weight = c.blocks.energy > 0 ? 1 / c.blocks.energy : 0;
    channels.push_back(std::move(c));
  }
  // Channels at their energy, in logarithms: the clearer channel decides, whatever the scales.
  double best = INFINITY, omega = 0;
  for (double cycles = 0.5; cycles < 1.7 * kFewCycles; cycles += 0.1) {
    const double w = kTwoPi * cycles / n;
    if (w > std::numbers::pi) break;
    if (!std::isfinite(solve_all(channels, w, centre, false))) continue;
    double objective = 0;
    for (const Channel& c : channels) objective += std::log(c.weight * c.solution.chi_square + 1e-12);
    if (objective < best) best = objective, omega = w;
  }
  return omega;
}

/// Blocks of all channels for a frequency known to within `error`.
std::vector<Channel> compressed(std::span<const SineChannel> inputs, double omega, double error) {
  const double n = static_cast<double>(inputs.front().y.size());
  const bool few = omega * n < kFewCycles * kTwoPi;
  std::vector<Channel> channels;
  for (const SineChannel& input : inputs) {
    Channel c;
    c.reference = mean_of(input.y);
    const double most = few ? n / 512 : std::min(n / 128, 1.2 / error);
    Plan plan = plan_with_length(input.y.size(), input.y.size(), most, few ? 0 : omega);
    c.blocks = compress(input.y, plan, c.reference);
    channels.push_back(std::move(c));
  }
  return channels;
}

struct Settled {
  double omega = 0;
  int iterations = 0;
  bool converged = false;
};

/// Gauss-Newton over the frequency, everything linear solved at each step; weights follow.
Settled settle(std::vector<Channel>& channels, double omega, double centre) {
  Settled s{omega, 0, false};
  const double bin = kTwoPi / (2 * centre + 1);
  for (Channel& c : channels) c.weight = 1;
  if (!std::isfinite(solve_all(channels, omega, centre, true))) return s;
  for (Channel& c : channels) weigh(c);
  double last_step = INFINITY;
  for (s.iterations = 1; s.iterations <= 60; ++s.iterations) {
    double up = 0, down = 0;
    for (const Channel& c : channels) {
      up += c.weight * c.solution.slope_residual;
      down += c.weight * c.solution.own_slope_square();
    }
    if (!(down > 0)) return s;
    double step = std::clamp(up / down, -0.4 * bin, 0.4 * bin);
    if (std::fabs(step) > 0.9 * last_step) step *= 0.5;  // swinging: the basin is narrow
    last_step = std::fabs(step);
    s.omega += step;
    if (!(s.omega > 0.2 * bin) || !(s.omega < std::numbers::pi)) return s;
    if (!std::isfinite(solve_all(channels, s.omega, centre, true))) return s;
    for (Channel& c : channels) weigh(c);
    if (std::fabs(step) * std::sqrt(down) < 1e-3 || std::fabs(step) < 1e-15 * s.omega) {
      s.converged = true;
      return s;
    }
  }
  return s;
}

/// Harmonics that stand out are taken out of the blocks, and what they did to the fundamental with them.
bool take_out_harmonics(std::vector<Channel>& channels, const std::vector<SampleLook>& looks,
                        std::vector<std::vector<Complex>>& taken, double omega, double centre) {
  bool any = false;
  for (std::size_t c = 0; c < channels.size(); ++c) {
    for (std::size_t h = 0; h < looks[c].harmonics.size(); ++h) {
      const Complex found = looks[c].harmonics[h];
      const bool clear = std::abs(found) > kClearHarmonic * looks[c].harmonic_u;
      const Complex wanted = clear || taken[c][h] != 0.0 ? found : 0.0;
      const Complex more = wanted - taken[c][h];
      if (more == 0.0) continue;
      subtract_sine(channels[c].blocks, static_cast<double>(h + 2) * omega, centre, more);
      taken[c][h] = wanted;
      any = any || std::abs(more) > 0.1 * looks[c].harmonic_u;
    }
  }
  return any;
}

/// Columns of damped_sine's a, q, p, s, c at a = 0 into omega, re, im, offset at the centre.
Eigen::Matrix<double, 4, 5> into_sine_columns(double omega, double centre, Complex phasor) {
  const double re = phasor.real(), im = phasor.imag();
  const double c = std::cos(omega * centre), s = std::sin(omega * centre);
  Eigen::Matrix<double, 4, 5> t = Eigen::Matrix<double, 4, 5>::Zero();
  t(0, 1) = 2 * omega;
  t(0, 2) = centre * (im * c - re * s);
  t(0, 3) = (re * s - im * c) + omega * centre * (re * c + im * s);
  t(1, 2) = c, t(1, 3) = omega * s;
  t(2, 2) = s, t(2, 3) = -omega * c;
  t(3, 4) = 1;
  return t;
}

DampedSine as_damped_sine(double omega, double centre, Complex phasor, double offset) {
  const double c = std::cos(omega * centre), s = std::sin(omega * centre);
  return {0, omega * omega, phasor.real() * c + phasor.imag() * s,
          omega * (phasor.real() * s - phasor.imag() * c), offset};
}

/// The normal matrix of all parameters, weighted.
Eigen::MatrixXd normal_matrix(const std::vector<Channel>& channels, const std::vector<FittedSine>& fitted) {
  const auto size = static_cast<Eigen::Index>(1 + 3 * channels.size());
  Eigen::MatrixXd normal = Eigen::MatrixXd::Zero(size, size);
  for (std::size_t c = 0; c < channels.size(); ++c) {
    const auto at = static_cast<Eigen::Index>(1 + 3 * c);
    const double w = 1 / (fitted[c].sigma * fitted[c].sigma);
    normal(0, 0) += w * channels[c].solution.slope_square;
    normal.block<3, 1>(at, 0) = w * channels[c].solution.cross;
    normal.block<1, 3>(0, at) = w * channels[c].solution.cross.transpose();
    normal.block<3, 3>(at, at) = w * channels[c].solution.normal;
  }
  return normal;
}

/// Inverse of a matrix whose rows have very different sizes.
Eigen::MatrixXd scaled_inverse(const Eigen::MatrixXd& m) {
  const Eigen::VectorXd scale = m.diagonal().cwiseSqrt().cwiseInverse();
  if (!scale.allFinite()) return {};
  const Eigen::MatrixXd unit = scale.asDiagonal() * m * scale.asDiagonal();
  const Eigen::LDLT<Eigen::MatrixXd> ldlt(unit);
  if (!ldlt.isPositive() || !(ldlt.vectorD().minCoeff() > 1e-12)) return {};
  return scale.asDiagonal() * ldlt.solve(Eigen::MatrixXd::Identity(m.rows(), m.cols())) * scale.asDiagonal();
}

void judge_noise(FittedSine& fitted, const Channel& channel, const SampleLook& look) {
  const double dof = std::max(1.0, static_cast<double>(channel.blocks.values_used()) - 4);
  const double floor = 1e-13 * (std::abs(fitted.phasor) + std::fabs(fitted.offset));
  fitted.sigma_in_band = std::max(std::sqrt(channel.solution.chi_square / dof), floor);
  fitted.sigma_per_sample = std::max(look.sigma, floor);
  const double excess = 1 + 2.6 * std::sqrt(2 / dof + 2 / look.dof);
  const bool coloured = std::pow(fitted.sigma_in_band / fitted.sigma_per_sample, 2) > excess;
  fitted.sigma = coloured ? fitted.sigma_in_band : fitted.sigma_per_sample;
  fitted.dof = coloured ? dof : look.dof;
  fitted.samples = channel.blocks.samples();
  fitted.harmonics = look.harmonics;
  fitted.harmonic_u = look.harmonic_u;
}

/// Converters that noise does not dither: sigma of what is white, and the covariance of the rest's push on J^T y.
Eigen::MatrixXd rounding_push(FittedSine& fitted, const SineChannel& input, double omega, double centre) {
  const double step = input.resolution;
  if (!(step > 0)) return {};
  const double scatter = fitted.sigma_per_sample * fitted.sigma_per_sample;
  const double own = std::sqrt(std::max(scatter - step * step / 12, 1e-4 * step * step));
  fitted.undithered = fitted.sigma_per_sample < kUndithered * step;
  if (!rounding_matters(input.y.size(), step, own)) return {};
  const DampedSine model = as_damped_sine(omega, centre, fitted.phasor, fitted.offset);
  const RoundingError error =
      rounding_error(model, input.y.size(), step, own, Eigen::MatrixXd::Identity(5, 5));
  if (fitted.undithered) fitted.sigma = std::max(std::sqrt(std::max(scatter - error.mean_square, 0.0)), own);
  const Eigen::Matrix<double, 4, 5> t = into_sine_columns(omega, centre, fitted.phasor);
  return t * error.covariance * t.transpose();
}

Error no_line(std::string finding) {
  return {Problem::no_signal, "", std::move(finding), "check that the source is on and that the range is not far too coarse"};
}

SineFit conclude(std::span<const SineChannel> inputs, const std::vector<Channel>& channels,
                 std::vector<FittedSine> fitted, const Settled& settled, double centre) {
  SineFit result;
  std::vector<Eigen::MatrixXd> pushes;
  for (std::size_t c = 0; c < channels.size(); ++c) {
    pushes.push_back(rounding_push(fitted[c], inputs[c], settled.omega, centre));
  }
  const auto size = static_cast<Eigen::Index>(1 + 3 * channels.size());
  Fit& fit = result.fit;
  fit.parameters = Eigen::VectorXd(size);
  fit.parameters[0] = settled.omega;
  const Eigen::MatrixXd inverse = scaled_inverse(normal_matrix(channels, fitted));
  double residual = 0;
  for (std::size_t c = 0; c < channels.size(); ++c) {
    const auto at = static_cast<Eigen::Index>(1 + 3 * c);
    fit.parameters.segment<3>(at) << fitted[c].phasor.real(), fitted[c].phasor.imag(), fitted[c].offset;
    residual = std::max(residual, fitted[c].sigma_in_band / fitted[c].sigma_per_sample);
  }
  if (inverse.size() > 0) {
    fit.covariance = inverse;
    for (std::size_t c = 0; c < channels.size(); ++c) {
      if (pushes[c].size() == 0) continue;
      const auto at = static_cast<Eigen::Index>(1 + 3 * c);
      Eigen::MatrixXd columns(size, 4);
      columns << inverse.col(0), inverse.middleCols(at, 3);
      columns /= fitted[c].sigma * fitted[c].sigma;
      fit.covariance += columns * pushes[c] * columns.transpose();
    }
  }
  fit.stop = inverse.size() > 0 ? FitStop::converged : FitStop::rank_deficient;
  fit.iterations = settled.iterations;
  fit.residual_rms = fitted.front().sigma_per_sample;
  fit.reduced_chi_square = residual * residual;
  fit.at_bound.assign(static_cast<std::size_t>(size), false);
  result.omega = settled.omega;
  result.centre = centre;
  result.cycles = settled.omega * static_cast<double>(inputs.front().y.size()) / kTwoPi;
  result.channels = std::move(fitted);
  return result;
}

}  // namespace

Result<SineFit> fit_sines(std::span<const SineChannel> inputs, const SineFitOptions& options) {
  assert(!inputs.empty());
  const std::size_t samples = inputs.front().y.size();
  for (const SineChannel& input : inputs) {
    assert(input.y.size() == samples);
    const std::span<const double> head = input.y.first(std::min<std::size_t>(samples, 4096));
    std::size_t present = present_sum(head, 0).count;
    if (present < kFewest && samples > 4096) present += present_sum(input.y.subspan(4096), 0).count;
    if (present < kFewest) {
      return failure(Problem::too_few_samples, "",
                     fmt::format("only {} samples are present; a fit needs {}", present, kFewest),
                     "widen the window or sample faster");
    }
  }
  const double n = static_cast<double>(samples), centre = (n - 1) / 2;
  Start start = options.near_omega > 0 ? Start{options.near_omega, 0.5 * kTwoPi / n} : strongest_line(inputs);
  if (!(start.omega > 0)) return tl::make_unexpected(no_line("all samples are equal"));
  if (start.omega * n < kFewCycles * kTwoPi && !(options.near_omega > 0)) {
    start = {scanned_omega(inputs, centre), 0.1 * kTwoPi / n};
    if (!(start.omega > 0)) return tl::make_unexpected(no_line("no oscillation stands out of the noise"));
  }
  std::vector<Channel> channels = compressed(inputs, start.omega, start.error);
  double omega = start.omega;
  if (start.error > 0.45 * kTwoPi / n) {
    // Known from a part of the record only: the channel whose line is clearer after refining decides.
    double best = -1;
    for (const Channel& c : channels) {
      if (c.blocks.omega == 0 || c.blocks.rank < 2) continue;
      const double refined = refined_omega(c.blocks);
      double clear = 0;
      for (const Channel& each : channels) {
        const SineSolution s = solve_sine(each.blocks, refined, centre, false);
        if (s.solvable && each.blocks.energy > 0) clear += 1 - s.chi_square / each.blocks.energy;
      }
      if (clear > best) best = clear, omega = refined;
    }
  }
  Settled settled = settle(channels, omega, centre);
  std::vector<std::vector<Complex>> taken(channels.size(), std::vector<Complex>(4));
  std::vector<FittedSine> fitted(channels.size());
  std::vector<SampleLook> looks(channels.size());
  const bool few = settled.omega * n < 60 * kTwoPi;
  for (int round = 0;; ++round) {
    if (!std::isfinite(settled.omega) || !channels.front().solution.solvable) break;
    for (std::size_t c = 0; c < channels.size(); ++c) {
      fitted[c].phasor = channels[c].solution.phasor();
      fitted[c].offset = channels[c].solution.linear[2] + channels[c].reference;
      looks[c] = look_at_samples(inputs[c].y, settled.omega, centre, fitted[c].offset);
    }
    if (round == (few ? 6 : 2) || !settled.converged) break;
    if (!take_out_harmonics(channels, looks, taken, settled.omega, centre)) break;
    settled = settle(channels, settled.omega, centre);
  }
  bool seen = false;
  for (std::size_t c = 0; c < channels.size(); ++c) {
    if (!channels[c].solution.solvable) break;
    judge_noise(fitted[c], channels[c], looks[c]);
    const double gain = channels[c].solution.sine_energy();
    // Noise alone gives a gain of 2 ln(N) + 2 x with a probability of a few e^-x over all frequencies.
    const double threshold = 2 * (std::log(n) + 14);
    const double dof = fitted[c].dof, variance = fitted[c].sigma * fitted[c].sigma;
    seen = seen || dof * std::log1p(gain / (dof * variance)) > threshold;
  }
  if (!seen) return tl::make_unexpected(no_line("no oscillation stands out of the noise"));
  const double cycles = settled.omega * n / kTwoPi;
  if (cycles < kLeastCycles) {
    return tl::make_unexpected(no_line(fmt::format("the record holds {:.2f} of a cycle: too little to tell a sine from a drift", cycles)));
  }
  if (!settled.converged) {
    return failure(Problem::not_converged, "",
                   fmt::format("the fit of a common sine did not settle after {} steps", settled.iterations),
                   "narrow the window to a stretch of steady amplitude and frequency");
  }
  return conclude(inputs, channels, std::move(fitted), settled, centre);
}

double sine_omega_bound(std::size_t samples, std::span<const double> amplitude, std::span<const double> sigma) {
  assert(amplitude.size() == sigma.size());
  const double n = static_cast<double>(samples);
  double strength = 0;
  for (std::size_t c = 0; c < amplitude.size(); ++c) strength += std::pow(amplitude[c] / sigma[c], 2);
  return std::sqrt(24 / (n * (n * n - 1) * strength));
}

}  // namespace coilassay

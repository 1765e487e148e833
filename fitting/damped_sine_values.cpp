// Values of the model, and what no estimator can beat.
#include <Eigen/Cholesky>
#include <algorithm>
#include <array>
#include <cassert>
#include <cmath>

#include "fitting/damped_sine.h"
#include "fitting/damped_sine_equations.h"

namespace coilassay {

double DampedSine::operator()(double n) const {
  const DampedPair at = damped_pair({a, q}, n);
  return p * at.c + s * at.s + c;
}

void evaluate(const DampedSine& model, double first_n, std::span<double> out) {
  // Four interleaved recurrences, so that no step waits for the one before; reseeded every 256 samples.
  constexpr std::size_t kStretch = 256, kLanes = 4;
  const Shape shape{model.a, model.q};
  const DampedPair step = damped_pair(shape, kLanes);
  std::array<DampedPair, kLanes> ahead;
  for (std::size_t lane = 0; lane < kLanes; ++lane) ahead[lane] = damped_pair(shape, static_cast<double>(lane));
  const auto after = [&model](const DampedPair& from, const DampedPair& by) {
    return DampedPair{from.c * by.c - model.q * from.s * by.s, from.c * by.s + from.s * by.c};
  };
  for (std::size_t at = 0; at < out.size(); at += kStretch) {
    const std::span<double> stretch = out.subspan(at, std::min(kStretch, out.size() - at));
    const DampedPair seed = damped_pair(shape, first_n + static_cast<double>(at));
    std::array<DampedPair, kLanes> now;
    for (std::size_t lane = 0; lane < kLanes; ++lane) now[lane] = after(seed, ahead[lane]);
    for (std::size_t i = 0; i < stretch.size(); i += kLanes) {
      const std::size_t lanes = std::min(kLanes, stretch.size() - i);
      for (std::size_t lane = 0; lane < lanes; ++lane) {
        stretch[i + lane] = model.p * now[lane].c + model.s * now[lane].s + model.c;
        now[lane] = after(now[lane], step);
      }
    }
  }
}

Eigen::VectorXd damped_sine_bound(const DampedSine& truth, std::size_t samples, double sigma) {
  assert(samples >= 5 && sigma > 0);
  const Shape shape{truth.a, truth.q};
  const DampedPair step = damped_pair(shape, 1);
  DampedPair now;
  Eigen::Matrix<double, 5, 5> information = Eigen::Matrix<double, 5, 5>::Zero();
  for (std::size_t i = 0; i < samples; ++i) {
    const double n = static_cast<double>(i);
    if (i % 64 == 0) {
      // Where nothing is left of the oscillation only the offset learns from the rest.
      if (shape.slow_decay() * n > 60) {
        information(4, 4) += static_cast<double>(samples - i);
        break;
      }
      now = damped_pair(shape, n);
    } else {
      now = {now.c * step.c - truth.q * now.s * step.s, now.c * step.s + now.s * step.c};
    }
    Eigen::Matrix<double, 5, 1> slope;
    slope << -n * (truth.p * now.c + truth.s * now.s),
        -truth.p * n * now.s / 2 + truth.s * damped_sine_slope(shape, n, now), now.c, now.s, 1;
    information.selfadjointView<Eigen::Lower>().rankUpdate(slope);
  }
  const Eigen::Matrix<double, 5, 5> full = information.selfadjointView<Eigen::Lower>();
  const Eigen::Matrix<double, 5, 1> scale = full.diagonal().cwiseSqrt().cwiseInverse();
  const Eigen::Matrix<double, 5, 5> scaled = scale.asDiagonal() * full * scale.asDiagonal();
  const Eigen::Matrix<double, 5, 5> inverse = scaled.ldlt().solve(Eigen::Matrix<double, 5, 5>::Identity());
  return sigma * scale.cwiseProduct(inverse.diagonal().cwiseSqrt());
}

}  // namespace coilassay

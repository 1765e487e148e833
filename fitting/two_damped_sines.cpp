// Two modes on one offset: each start from a matrix pencil or from what one mode leaves over.
#include <fmt/format.h>

#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

#include "fitting/damped_sine.h"
#include "fitting/damped_sine_plan.h"
#include "fitting/damped_sine_search.h"
#include "fitting/damped_sine_start.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;

// Complex amplitude of each block at the demodulating frequency, by least squares within the block (the inverse Gram
// matrix): a sum over a block shorter than a period would contain the image and the offset.
std::vector<Complex> local_amplitudes(const WhiteBlocks& blocks) {
  std::vector<Complex> amplitudes;
  for (std::size_t k = 0; k < blocks.count; ++k) {
    if (blocks.present[k] == 0) break;  // the pencil needs an even grid
    Complex x = 0;
    for (int r = 0; r < blocks.rank; ++r) {
      x += Complex(blocks.whitening(r, 0), blocks.whitening(r, 1)) *
           blocks.values[k * static_cast<std::size_t>(blocks.rank) + static_cast<std::size_t>(r)];
    }
    amplitudes.push_back(x);
  }
  return amplitudes;
}

// Matrix pencil: the two strongest directions of the Hankel matrix shift by the two poles.
std::vector<Shape> pencil(const WhiteBlocks& blocks) {
  const std::vector<Complex> x = local_amplitudes(blocks);
  if (x.size() < 16) return {};
  const auto columns = static_cast<Eigen::Index>(x.size() / 3);
  const auto rows = static_cast<Eigen::Index>(x.size()) - columns + 1;
  Eigen::MatrixXcd hankel(rows, columns);
  for (Eigen::Index i = 0; i < rows; ++i) {
    for (Eigen::Index j = 0; j < columns; ++j) hankel(i, j) = x[static_cast<std::size_t>(i + j)];
  }
  const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXcd> solver(hankel.adjoint() * hankel);
  // Rows of the conjugate eigenvectors carry lambda^j, j the column.
  const Eigen::MatrixXcd v = solver.eigenvectors().rightCols(2).conjugate();
  const Eigen::MatrixXcd upper = v.topRows(columns - 1), lower = v.bottomRows(columns - 1);
  const Eigen::Matrix2cd gram = upper.adjoint() * upper, shifted = upper.adjoint() * lower;
  const Eigen::ComplexEigenSolver<Eigen::Matrix2cd> poles(gram.inverse() * shifted, false);
  std::vector<Shape> shapes;
  for (Eigen::Index i = 0; i < 2; ++i) {
    const Complex z = std::log(poles.eigenvalues()[i]) / static_cast<double>(blocks.length);
    const double omega = blocks.omega + z.imag();
    if (!std::isfinite(z.real()) || !(omega > 0)) return {};
    shapes.push_back({-z.real(), omega * omega});
  }
  return shapes;
}

struct Try {
  double chi_square = 0;
  Shapes<2> shapes;
};

// Blocks in whose band both modes lie.
Plan plan_for_two(const Shapes<2>& shapes, std::size_t samples) {
  const double low = std::min(shapes[0].omega(), shapes[1].omega()),
               high = std::max(shapes[0].omega(), shapes[1].omega());
  const Shape slower = shapes[0].slow_decay() < shapes[1].slow_decay() ? shapes[0] : shapes[1];
  const Plan alone = plan_for(slower, 0, samples);
  const std::size_t span = alone.tail_from < samples ? alone.tail_from : samples;
  double most = static_cast<double>(alone.length);
  const double fastest = std::max(shapes[0].fast_decay(), shapes[1].fast_decay());
  if (alone.omega == 0) {
    most = std::min({most, 0.1 / std::max(fastest, 1e-300), 2 * std::numbers::pi / std::max(high, 1e-300) / 64});
    return plan_with_length(samples, span, most, 0);
  }
  most = std::min({most, 0.05 / std::max(fastest, 1e-300), 0.5 / std::max(high - low, 1e-300)});
  return plan_with_length(samples, span, most, (low + high) / 2);
}

double size_at_start(const Shape& shape, double p, double s) {
  return shape.q > 0 ? std::hypot(p, s / std::sqrt(shape.q)) : std::abs(p);
}

std::vector<Shapes<2>> starts(std::span<const double> y, const DampedSineFit& one) {
  const double a = std::max(one.model.a, 1e-3 / static_cast<double>(y.size()));
  const double omega = one.model.damped_omega();
  std::vector<Shapes<2>> result;
  if (omega > 0) {
    // Close modes: 96 local amplitudes over six time constants, and plain guesses beside them.
    const auto span = static_cast<std::size_t>(std::min(6 / a, static_cast<double>(y.size())));
    const std::size_t length = span / 96;
    if (length >= 1) {
      const std::vector<Shape> pair = pencil(white_blocks(y, length, 96, omega, one.model.c, y.size()));
      if (pair.size() == 2) {
        Shapes<2> shapes{pair[0], pair[1]};
        for (Shape& shape : shapes) shape.a = std::clamp(shape.a, 0.05 * a, 20 * a);
        result.push_back(shapes);
      }
    }
    for (const double spacing : {-6.0, -2.0, -1.0, 1.0, 2.0, 6.0}) {
      for (const double split : {0.3, 0.7}) {
        const double first = omega - split * spacing * a, second = first + spacing * a;
        if (first > 0 && second > 0) result.push_back({Shape{a, first * first}, Shape{a, second * second}});
      }
    }
  }
  // Modes apart: the strongest line of what one mode leaves over.
  std::vector<double> rest(y.size());
  evaluate(one.model, 0, rest);
  for (std::size_t i = 0; i < y.size(); ++i) rest[i] = y[i] - rest[i];
  const StrongestLine line = find_beginning(rest).line;
  if (line.strength > 0 && line.omega > 0) {
    for (const double decay : {0.3, 1.26, 5.0}) {
      result.push_back(
          {Shape{one.model.a, one.model.q}, Shape{decay / static_cast<double>(line.length), line.omega * line.omega}});
    }
  }
  return result;
}

Solution<2> best_of(const WhiteBlocks& blocks, std::vector<Shapes<2>> candidates, const ShapeLimits& limits) {
  std::vector<Try> tries;
  for (const Shapes<2>& shapes : candidates) {
    if (!limits.allow(shapes[0]) || !limits.allow(shapes[1])) continue;
    const auto at = equations<2>(blocks, shapes, false);
    if (at.solvable) tries.push_back({at.chi_square, shapes});
  }
  std::sort(tries.begin(), tries.end(), [](const Try& x, const Try& z) { return x.chi_square < z.chi_square; });
  Solution<2> best;
  for (std::size_t i = 0; i < std::min<std::size_t>(3, tries.size()); ++i) {
    Solution<2> solution = refine<2>(blocks, tries[i].shapes, limits);
    if (solution.gain() > best.gain()) best = std::move(solution);
  }
  return best;
}

}  // namespace

Result<TwoModeFit> fit_two_damped_sines(std::span<const double> whole, const DampedSineOptions& options) {
  const auto one = fit_damped_sine(whole, options);
  if (!one) return failure(one);
  const std::span<const double> y = whole.first(one->samples);
  const ShapeLimits limits = shape_limits(y.size());
  const double reference = one->model.c;
  const Shape single{one->model.a, one->model.q};

  // Near and far candidates need blocks of their own; the better one by what it takes from the energy of its blocks.
  Solution<2> best;
  Plan plan;
  WhiteBlocks blocks;
  double best_gain = -std::numeric_limits<double>::infinity(), gain = 0;
  std::vector<Shapes<2>> near, far;
  for (const Shapes<2>& shapes : starts(y, *one)) {
    const double apart = std::abs(shapes[0].omega() - shapes[1].omega());
    (apart < 40 * std::max(shapes[0].a, shapes[1].a) ? near : far).push_back(shapes);
  }
  for (const auto& candidates : {near, far}) {
    if (candidates.empty()) continue;
    Plan now = plan_for_two(candidates.front(), y.size());
    for (const Shapes<2>& shapes : candidates) {
      const Plan other = plan_for_two(shapes, y.size());
      if (other.length < now.length) now = other;
    }
    WhiteBlocks sums = compress(y, now, reference);
    Solution<2> solution = best_of(sums, candidates, limits);
    for (int round = 0; round < 3 && solution.at.solvable; ++round) {
      const Plan wanted = plan_for_two(solution.shapes, y.size());
      if (wanted.length * 3 > now.length && wanted.length < now.length * 3 && now.tail_from == wanted.tail_from) break;
      now = wanted;
      sums = compress(y, now, reference);
      solution = refine<2>(sums, solution.shapes, limits);
    }
    if (!solution.at.solvable) continue;
    const Solution<1> alone = refine<1>(sums, {single}, limits);
    const double more = alone.at.chi_square - solution.at.chi_square;
    if (alone.at.solvable && more > best_gain) {
      best_gain = gain = more;
      best = std::move(solution);
      plan = now;
      blocks = std::move(sums);
    }
  }
  const Eigen::MatrixXd inverse = best.at.solvable ? inverse_normal<2>(best.at) : Eigen::MatrixXd();
  if (!best.converged || inverse.size() == 0) {
    return failure(Problem::not_converged, "",
                   fmt::format("no second oscillation could be told apart ({} steps)", best.iterations),
                   "one oscillation describes the record as well as two");
  }

  TwoModeFit result;
  const Linear<2>& linear = best.at.linear;
  std::array<std::size_t, 2> order{0, 1};
  const auto size = [&](std::size_t mode) {
    const auto at = static_cast<Eigen::Index>(2 * mode);
    return size_at_start(best.shapes[mode], linear[at], linear[at + 1]);
  };
  if (size(1) > size(0)) order = {1, 0};
  std::array<DampedSine, 2> models;
  std::array<Eigen::Index, 9> from{};
  from[8] = 8;
  for (std::size_t i = 0; i < 2; ++i) {
    const Shape& shape = best.shapes[order[i]];
    const auto at = static_cast<Eigen::Index>(2 * order[i]);
    models[i] = {shape.a, shape.q, linear[at], linear[at + 1], 0};
    for (std::size_t j = 0; j < 4; ++j) from[4 * i + j] = static_cast<Eigen::Index>(4 * order[i] + j);
  }
  models[0].c = linear[4] + reference;
  result.first = models[0];
  result.second = models[1];

  std::vector<double> first(y.size()), second(y.size());
  evaluate(models[0], 0, first);
  evaluate(models[1], 0, second);
  double squares = 0;
  std::size_t present = 0;
  for (std::size_t i = 0; i < y.size(); ++i) {
    const double r = y[i] - first[i] - second[i];
    if (!std::isfinite(r)) continue;
    squares += r * r;
    ++present;
  }
  const double per_sample = squares / std::max(1.0, static_cast<double>(present) - 9);
  const double band_dof = std::max(1.0, static_cast<double>(blocks.values_used()) - 9);
  const double in_band = best.at.chi_square / band_dof;
  const bool coloured = in_band > per_sample * (1 + 2.6 * std::sqrt(2 / band_dof));
  result.sigma = std::sqrt(coloured ? in_band : per_sample);
  result.gain = gain / (result.sigma * result.sigma);
  Fit& fit = result.fit;
  fit.parameters = Eigen::VectorXd(9);
  fit.parameters << models[0].a, models[0].q, models[0].p, models[0].s, models[1].a, models[1].q, models[1].p,
      models[1].s, models[0].c;
  fit.covariance = Eigen::MatrixXd(9, 9);
  for (std::size_t i = 0; i < 9; ++i) {
    for (std::size_t j = 0; j < 9; ++j) {
      fit.covariance(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(j)) =
          inverse(from[i], from[j]) * result.sigma * result.sigma;
    }
  }
  fit.residual_rms = std::sqrt(per_sample);
  fit.reduced_chi_square = in_band / (result.sigma * result.sigma);
  fit.iterations = best.iterations;
  fit.stop = FitStop::converged;
  fit.at_bound.assign(9, false);
  return result;
}

}  // namespace coilassay

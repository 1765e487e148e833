#include "fitting/roll_off_fit.h"

#include <Eigen/Cholesky>
#include <Eigen/LU>
#include <algorithm>
#include <array>
#include <cmath>

#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr int kPanels = 96;
constexpr int kPlaces = 2 * kPanels + 1;   // nodes and midpoints
constexpr int kParameters = 7;
enum : int { kSlope, kFloor, kKnee, kExponent, kOffset, kShift, kBend };
constexpr int kMostIterations = 60;
constexpr double kSettled = 1e-5;          // of a step, in squared standard uncertainties
constexpr double kSignificant = 0.05;      // F less likely than this widens the covariance

using Vector = Eigen::Matrix<double, kParameters, 1>;
using Matrix = Eigen::Matrix<double, kParameters, kParameters>;
using ShapeRow = std::array<double, 5>;    // derivatives to ln g0, s, ln k, ln m, b

RollOff curve_of(const Vector& p, bool straight) {
  RollOff curve{std::exp(p[kSlope]), p[kFloor], std::exp(p[kKnee]), std::exp(p[kExponent]), p[kBend]};
  if (straight) curve.floor_share = 1;
  return curve;
}

/// The integral of a curve and its derivatives on an even grid of y, made anew for every trial of parameters; the
/// logarithms of the grid stay.
class IntegralTable {
 public:
  explicit IntegralTable(double top) : step_(top / kPanels) {
    for (int i = 1; i < kPlaces; ++i) logarithm_[static_cast<std::size_t>(i)] = std::log(step_ * i / 2);
  }

  /// false when the curve does not rise everywhere on the grid.
  bool make(const Vector& p, bool straight) {
    const double g0 = std::exp(p[kSlope]), s = straight ? 1 : p[kFloor], ln_k = p[kKnee], m = std::exp(p[kExponent]), b = p[kBend];
    ShapeRow at{}, middle{};
    slope_[0] = g0;
    slope_d_[0] = {g0, 0, 0, 0, 0};
    x_[0] = 0;
    x_d_[0] = {};
    at = slope_d_[0];
    for (std::size_t n = 0; n < kPanels; ++n) {
      double g_middle = 0;
      if (!evaluate(2 * n + 1, g0, s, ln_k, m, b, g_middle, middle)) return false;
      if (!evaluate(2 * n + 2, g0, s, ln_k, m, b, slope_[n + 1], slope_d_[n + 1])) return false;
      x_[n + 1] = x_[n] + step_ / 6 * (slope_[n] + 4 * g_middle + slope_[n + 1]);
      for (std::size_t j = 0; j < at.size(); ++j) {
        x_d_[n + 1][j] = x_d_[n][j] + step_ / 6 * (slope_d_[n][j] + 4 * middle[j] + slope_d_[n + 1][j]);
      }
    }
    return true;
  }

  /// y with integral x >= 0, g there, and the derivatives of the integral at fixed y; `hint` is a panel to start from.
  double solve(double x, std::size_t& hint, double& g, ShapeRow& d) const {
    if (x >= x_[kPanels]) {   // beyond the grid: straight on
      g = slope_[kPanels];
      for (std::size_t j = 0; j < d.size(); ++j) d[j] = x_d_[kPanels][j];
      return step_ * kPanels + (x - x_[kPanels]) / g;
    }
    while (x_[hint + 1] < x) ++hint;
    while (hint > 0 && x_[hint] > x) --hint;
    const std::size_t n = hint;
    const double rise = x_[n + 1] - x_[n];
    const double left = step_ * slope_[n], right = step_ * slope_[n + 1];
    // Cubic through both ends with both slopes.
    const double c2 = 3 * rise - 2 * left - right, c3 = left + right - 2 * rise;
    double t = (x - x_[n]) / rise;
    for (int i = 0; i < 3; ++i) {
      const double value = x_[n] + t * (left + t * (c2 + t * c3)) - x;
      const double change = value / (left + t * (2 * c2 + 3 * t * c3));
      t -= change;
      if (std::fabs(change) < 1e-9) break;
    }
    g = (left + t * (2 * c2 + 3 * t * c3)) / step_;
    const double t2 = t * t, t3 = t2 * t;
    const double h01 = 3 * t2 - 2 * t3, h10 = (t - 2 * t2 + t3) * step_, h11 = (t3 - t2) * step_;
    for (std::size_t j = 0; j < d.size(); ++j) {
      d[j] = x_d_[n][j] + h01 * (x_d_[n + 1][j] - x_d_[n][j]) + h10 * slope_d_[n][j] + h11 * slope_d_[n + 1][j];
    }
    return step_ * (static_cast<double>(n) + t);
  }

 private:
  bool evaluate(std::size_t place, double g0, double s, double ln_k, double m, double b, double& g, ShapeRow& d) const {
    const double ln_z = logarithm_[place] - ln_k;
    const double zm = std::exp(m * ln_z);
    const double z2 = b == 0 && !with_bend ? 0 : std::exp(2 * ln_z);
    const double denominator = 1 + b * z2 + (1 - b) * zm;
    if (!(denominator > 0.02)) return false;
    const double f = 1 / denominator;
    g = g0 * (s + (1 - s) * f);
    const double weight = g0 * (1 - s) * f * f;
    const double high = m * (1 - b) * zm;
    d = {g, g0 * (1 - f), weight * (2 * b * z2 + high), -weight * high * ln_z, weight * (zm - z2)};
    return g > 1e-4 * g0 && std::isfinite(g);
  }

 public:
  bool with_bend = false;

 private:
  double step_;
  std::array<double, kPlaces> logarithm_{};
  std::array<double, kPanels + 1> x_{}, slope_{};
  std::array<ShapeRow, kPanels + 1> x_d_{}, slope_d_{};
};

class Problem7 {
 public:
  Problem7(const RollOffBlocks& blocks, const RollOffKnown& known, double top)
      : blocks_(blocks), known_(known), table_(top), weight_(1 / (blocks.sigma_of_mean * blocks.sigma_of_mean)) {
    table_.with_bend = known.bend;
    center_.setZero();
    tight_.setZero();
    const auto hold = [&](int i, double center, double sigma) {
      center_[i] = center;
      tight_[i] = 1 / (sigma * sigma);
    };
    const double never = 1e-9;   // not fitted at all
    hold(kFloor, 0.1, known.straight ? never : 0.3);
    hold(kKnee, std::log(2 * top), known.straight ? never : 1.5);
    hold(kExponent, std::log(5.0), known.straight ? never : 1.0);
    hold(kBend, 0, known.bend && !known.straight ? 1.0 : never);
    if (known.offset) hold(kOffset, *known.offset, known.offset_sigma);
    if (std::isfinite(known.shift_sigma)) hold(kShift, 0, std::max(known.shift_sigma, 1e-12 * std::fabs(blocks.x.back())));
  }

  /// Chi-square at p with gradient and normal matrix; infinity where the curve is impossible.
  double look(const Vector& p, Vector* gradient, Matrix* normal) {
    if (!table_.make(p, known_.straight)) return HUGE_VAL;
    double chi = 0;
    if (gradient != nullptr) gradient->setZero(), normal->setZero();
    std::size_t hint = 0;
    Vector row;
    for (std::size_t i = 0; i < blocks_.x.size(); ++i) {
      const double r = blocks_.y[i] - predict(i, p, hint, row);
      chi += weight_ * r * r;
      if (gradient == nullptr) continue;
      gradient->noalias() += (weight_ * r) * row;
      for (int a = 0; a < kParameters; ++a) {
        const double wa = weight_ * row[a];
        for (int b = a; b < kParameters; ++b) (*normal)(a, b) += wa * row[b];
      }
    }
    for (int i = 0; i < kParameters; ++i) {
      const double off = center_[i] - p[i];
      chi += tight_[i] * off * off;
      if (gradient != nullptr) (*gradient)[i] += tight_[i] * off, (*normal)(i, i) += tight_[i];
    }
    if (normal != nullptr) normal->triangularView<Eigen::StrictlyLower>() = normal->transpose();
    return chi;
  }

  /// y of block i and its derivatives to the parameters.
  double predict(std::size_t i, const Vector& p, std::size_t& hint, Vector& row, double* slope = nullptr) const {
    const double x = blocks_.x[i] + p[kShift];
    double g = 0;
    ShapeRow d{};
    const double y = table_.solve(std::fabs(x), hint, g, d);
    const double sign = x < 0 ? -1 : 1;
    const double f = -sign / g;
    row[kSlope] = f * d[0];
    row[kFloor] = known_.straight ? 0 : f * d[1];
    row[kKnee] = f * d[2];
    row[kExponent] = f * d[3];
    row[kBend] = known_.bend ? f * d[4] : 0;
    row[kOffset] = 1;
    row[kShift] = 1 / g;
    if (slope != nullptr) *slope = g;
    return p[kOffset] + sign * y;
  }

  double weight() const { return weight_; }
  const Vector& center() const { return center_; }
  bool prepare(const Vector& p) { return table_.make(p, known_.straight); }
  /// Chi-square of the blocks alone.
  double of_blocks(const Vector& p) const {
    double chi = 0;
    std::size_t hint = 0;
    Vector row;
    for (std::size_t i = 0; i < blocks_.x.size(); ++i) {
      const double r = blocks_.y[i] - predict(i, p, hint, row);
      chi += weight_ * r * r;
    }
    return chi;
  }

 private:
  const RollOffBlocks& blocks_;
  const RollOffKnown& known_;
  IntegralTable table_;
  double weight_;
  Vector center_, tight_;
};

struct Settled {
  Vector p;
  double chi = HUGE_VAL;
  Matrix normal;
  int iterations = 0;
  FitStop stop = FitStop::failed;
};

/// Levenberg and Marquardt's steps, until one would move no parameter by a noticeable part of its uncertainty.
Settled descend(Problem7& problem, Vector p) {
  Settled best;
  Vector gradient;
  Matrix normal;
  double damping = 1e-3;
  double chi = problem.look(p, &gradient, &normal);
  best.p = p;
  if (!std::isfinite(chi)) return best;
  best.stop = FitStop::max_iterations;
  for (best.iterations = 0; best.iterations < kMostIterations; ++best.iterations) {
    Matrix damped = normal;
    damped.diagonal() *= 1 + damping;
    const Vector step = damped.ldlt().solve(gradient);
    if (!step.allFinite()) {
      best.stop = FitStop::rank_deficient;
      break;
    }
    const bool small = gradient.dot(step) < kSettled;
    Vector trial = p + step;
    // A step in a logarithm beyond a factor of three leaves what the slopes know about.
    for (int i : {int{kKnee}, int{kExponent}}) trial[i] = p[i] + std::clamp(step[i], -1.1, 1.1);
    Vector trial_gradient;
    Matrix trial_normal;
    const double trial_chi = problem.look(trial, &trial_gradient, &trial_normal);
    if (trial_chi <= chi) {
      p = trial;
      chi = trial_chi;
      gradient = trial_gradient;
      normal = trial_normal;
      damping = std::max(damping * 0.1, 1e-9);
      if (small) {
        best.stop = FitStop::converged;
        break;
      }
    } else {
      if (small && damping < 1e-2) {   // rounding: nothing left to gain
        best.stop = FitStop::converged;
        break;
      }
      damping *= 8;
      if (damping > 1e12) break;
    }
  }
  best.p = p;
  best.chi = chi;
  best.normal = normal;
  return best;
}

/// Slopes of a coarse look give the start: the first of them g0, the place where they have fallen by a third the knee.
Vector start_of(const RollOffBlocks& blocks, const RollOffKnown& known, const Vector& center) {
  constexpr std::size_t kBins = 16;
  const std::size_t n = blocks.x.size();
  std::array<double, kBins> slope{}, place{};
  for (std::size_t k = 0; k < kBins; ++k) {
    const std::size_t a = k * (n - 1) / kBins, b = (k + 1) * (n - 1) / kBins;
    const double dy = blocks.y[b] - blocks.y[a];
    slope[k] = dy != 0 && b > a ? (blocks.x[b] - blocks.x[a]) / dy : std::nan("");
    place[k] = (blocks.y[a] + blocks.y[b]) / 2;
  }
  Vector p = center;
  std::array<double, 5> early = {slope[0], slope[1], slope[2], slope[3], slope[4]};
  const double g0 = std::fabs(median(early));
  p[kSlope] = std::log(g0);
  if (!known.straight) {
    for (std::size_t k = 1; k < kBins; ++k) {
      if (slope[k] < 0.67 * g0) {
        p[kKnee] = std::log(std::fmax(std::fabs(place[k] - blocks.y[0]), 1e-3 * std::exp(center[kKnee])) * 1.05);
        p[kFloor] = std::clamp(0.6 * slope[kBins - 1] / g0, 0.02, 0.5);
        break;
      }
    }
  }
  if (!known.offset) p[kOffset] = blocks.y[0] - blocks.x[0] / g0;
  if (!std::isfinite(known.shift_sigma)) p[kShift] = (blocks.y[0] - p[kOffset]) * g0 - blocks.x[0];
  return p;
}

/// Covariance: block noise by the normal matrix, and the random walk of x through the response.
Eigen::MatrixXd covariance_of(const RollOffFit& fit, double walk_variance, double scale) {
  Eigen::MatrixXd covariance = scale * fit.inverse_normal;
  if (walk_variance > 0) {
    // An increment of the walk moves every later block: sums from the end.
    Vector tail = Vector::Zero();
    Matrix sum = Matrix::Zero();
    for (Eigen::Index i = fit.jacobian.rows(); i-- > 0;) {
      tail += fit.weight * fit.inverse_slope[i] * fit.jacobian.row(i).transpose();
      sum += walk_variance * tail * tail.transpose();
    }
    covariance += fit.inverse_normal * sum * fit.inverse_normal;
  }
  return covariance;
}

}  // namespace

Eigen::VectorXd RollOffFit::response(std::span<const double> dy, std::span<const double> dx) const {
  Eigen::VectorXd sum = Eigen::VectorXd::Zero(jacobian.cols());
  for (Eigen::Index i = 0; i < jacobian.rows(); ++i) {
    const auto k = static_cast<std::size_t>(i);
    sum += weight * (dy[k] - dx[k] * inverse_slope[i]) * jacobian.row(i).transpose();
  }
  return inverse_normal * sum;
}

Result<RollOffFit> fit_roll_off(const RollOffBlocks& blocks, const RollOffKnown& known) {
  if (blocks.x.size() < 12) {
    return failure(Problem::too_few_samples, "roll-off", std::to_string(blocks.x.size()) + " blocks of samples",
                   "give at least 100 samples of the rise");
  }
  double top = 0;
  const double base = known.offset.value_or(blocks.y.front());
  for (double y : blocks.y) top = std::fmax(top, std::fabs(y - base));
  if (!(top > 0) || !(blocks.sigma_of_mean > 0) || blocks.x.front() == blocks.x.back()) {
    return failure(Problem::bad_number, "roll-off", "x or y does not move, or y has no noise to weigh it by", "");
  }
  Problem7 problem(blocks, known, 1.02 * top);
  const Vector start = start_of(blocks, known, problem.center());
  if (!start.allFinite()) return failure(Problem::no_signal, "roll-off", "y does not rise with x", "");
  Settled best = descend(problem, start);
  const auto count = static_cast<double>(blocks.x.size());
  // Without the square term a moderate misfit is usually the family's own, and another start would only cost time. A descent
  // that ran into curves that do not rise everywhere (a floor below zero) stands at their edge, settled or not.
  const bool at_edge = best.p[kFloor] < 0;
  if (!known.straight && (best.stop != FitStop::converged || best.chi > (known.bend || at_edge ? 3 : 30) * count)) {
    for (double exponent : {2.5, 10.0, 20.0}) {   // a second opinion when the first start led nowhere
      Vector other = start;
      other[kExponent] = std::log(exponent);
      Settled next = descend(problem, other);
      const bool better = next.chi < best.chi && (next.stop == FitStop::converged || best.stop != FitStop::converged);
      if (better) best = next;
    }
  }
  if (!std::isfinite(best.chi)) {
    return failure(Problem::not_converged, "roll-off", "no curve of this kind follows the samples", "");
  }

  RollOffFit result;
  problem.prepare(best.p);
  result.curve = curve_of(best.p, known.straight);
  result.offset = best.p[kOffset];
  result.shift = best.p[kShift];
  result.chi_square = best.chi;
  result.blocks = blocks.x.size();
  result.weight = problem.weight();
  result.jacobian.resize(static_cast<Eigen::Index>(blocks.x.size()), kParameters);
  result.inverse_slope.resize(static_cast<Eigen::Index>(blocks.x.size()));
  result.predicted.resize(blocks.x.size());
  std::size_t hint = 0;
  Vector row;
  double of_blocks = 0;
  for (std::size_t i = 0; i < blocks.x.size(); ++i) {
    double g = 0;
    result.predicted[i] = problem.predict(i, best.p, hint, row, &g);
    const double r = blocks.y[i] - result.predicted[i];
    of_blocks += result.weight * r * r;
    result.jacobian.row(static_cast<Eigen::Index>(i)) = row.transpose();
    result.inverse_slope[static_cast<Eigen::Index>(i)] = 1 / g;
  }
  result.inverse_normal = best.normal.ldlt().solve(Matrix::Identity());
  const double free = known.straight ? 2 : known.bend ? 6 : 5;
  result.lack_of_fit = of_blocks / (count - free);
  result.f_probability = f_upper_tail(result.lack_of_fit, count - free, blocks.dof);
  const double scale = result.f_probability < kSignificant ? std::fmax(result.lack_of_fit, 1) : 1;

  Fit& fit = result.fit;
  fit.parameters = best.p;
  fit.covariance = covariance_of(result, known.walk_variance, scale);
  fit.residual_rms = std::sqrt(of_blocks / count / result.weight);
  fit.reduced_chi_square = result.lack_of_fit;
  fit.iterations = best.iterations;
  fit.stop = best.stop;
  fit.at_bound.assign(kParameters, false);
  return result;
}

}  // namespace coilassay

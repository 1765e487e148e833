#include "fitting/joint_fit.h"

#include <Eigen/Cholesky>
#include <Eigen/SVD>
#include <cassert>
#include <cmath>

namespace coilassay {

namespace {

constexpr double kOpen = 1e-7;         // of the largest singular value
constexpr double kDifference = 1e-5;   // of a parameter's scale: errors of rounding and of curvature are both near 1e-10
constexpr int kMostIterations = 200;

using Eigen::Index;

/// Scaled parameters t: p = p0 + scale * t.
class Engine {
 public:
  explicit Engine(const JointProblem& problem) : problem_(problem), m_(static_cast<Index>(problem.residual_count)) {
    for (std::size_t i = 0; i < problem.scale.size(); ++i) {
      if (problem.fixed.empty() || !problem.fixed[i]) free_.push_back(static_cast<Index>(i));
    }
  }
  Index n() const { return static_cast<Index>(free_.size()); }

  bool values(const Eigen::VectorXd& p, Eigen::VectorXd& r) const {
    r.resize(m_);
    return problem_.residuals({p.data(), static_cast<std::size_t>(p.size())}, {r.data(), static_cast<std::size_t>(m_)}) &&
           r.allFinite();
  }

  bool jacobian(const Eigen::VectorXd& p, Eigen::MatrixXd& j) const {
    j.resize(m_, n());
    Eigen::VectorXd up, down;
    for (Index c = 0; c < n(); ++c) {
      const Index i = free_[static_cast<std::size_t>(c)];
      const double h = kDifference * scale(c);
      Eigen::VectorXd moved = p;
      moved[i] = p[i] + h;
      const bool has_up = values(moved, up);
      moved[i] = p[i] - h;
      const bool has_down = values(moved, down);
      if (has_up && has_down) {
        j.col(c) = (up - down) / (2 * kDifference);
        continue;
      }
      Eigen::VectorXd here;
      if (!values(p, here) || (!has_up && !has_down)) return false;
      j.col(c) = (has_up ? up - here : here - down) / kDifference;
    }
    return j.allFinite();
  }

  /// One-sided, for the way down: half the work, and a slope off by 1e-5 costs no step.
  bool rough_jacobian(const Eigen::VectorXd& p, const Eigen::VectorXd& here, Eigen::MatrixXd& j) const {
    j.resize(m_, n());
    Eigen::VectorXd up, moved = p;
    for (Index c = 0; c < n(); ++c) {
      const Index i = free_[static_cast<std::size_t>(c)];
      moved[i] = p[i] + kDifference * scale(c);
      if (!values(moved, up)) return jacobian(p, j);
      j.col(c) = (up - here) / kDifference;
      moved[i] = p[i];
    }
    return j.allFinite();
  }

  Eigen::VectorXd moved(const Eigen::VectorXd& p, const Eigen::VectorXd& step) const {
    Eigen::VectorXd result = p;
    for (Index c = 0; c < n(); ++c) result[free_[static_cast<std::size_t>(c)]] += scale(c) * step[c];
    return result;
  }

  double scale(Index c) const { return problem_.scale[static_cast<std::size_t>(free_[static_cast<std::size_t>(c)])]; }
  Index parameter(Index c) const { return free_[static_cast<std::size_t>(c)]; }

 private:
  const JointProblem& problem_;
  Index m_;
  std::vector<Index> free_;
};

struct Descent {
  Eigen::VectorXd p, r;
  double chi_square = std::nan("");
  int iterations = 0;
  bool converged = false;
};

Descent descend(const Engine& engine, const Eigen::VectorXd& start) {
  Descent d;
  d.p = start;
  if (!engine.values(d.p, d.r)) return d;
  d.chi_square = d.r.squaredNorm();
  if (engine.n() == 0) {
    d.converged = true;
    return d;
  }
  double damping = 1e-3;
  Eigen::MatrixXd j;
  for (; d.iterations < kMostIterations; ++d.iterations) {
    if (!engine.rough_jacobian(d.p, d.r, j)) return d;
    const Eigen::MatrixXd normal = j.transpose() * j;
    const Eigen::VectorXd slope = j.transpose() * d.r;
    const double floor = 1e-12 * normal.diagonal().maxCoeff() + 1e-300;
    bool improved = false;
    while (damping < 1e12) {
      Eigen::MatrixXd damped = normal;
      damped.diagonal().array() += damping * (normal.diagonal().array() + floor);
      const Eigen::VectorXd step = -damped.ldlt().solve(slope);
      const Eigen::VectorXd tried = engine.moved(d.p, step);
      Eigen::VectorXd r;
      if (step.allFinite() && engine.values(tried, r) && r.squaredNorm() <= d.chi_square) {
        const double gained = d.chi_square - r.squaredNorm();
        d.p = tried;
        d.r = std::move(r);
        d.chi_square = d.r.squaredNorm();
        damping = std::fmax(damping / 10, 1e-12);
        improved = true;
        // The gain that the whole quadratic promises is what is left to do; and never more than all of chi-square.
        if (gained < 1e-9 * (1 + d.chi_square) && (damping < 1e-6 || d.chi_square < 1e-9)) {
          d.converged = true;
          return d;
        }
        break;
      }
      damping *= 10;
    }
    if (!improved) {
      d.converged = true;   // no step of any size helps: at the bottom to rounding
      return d;
    }
  }
  return d;
}

}  // namespace

JointFit fit_jointly(const JointProblem& problem, std::span<const double> start) {
  assert(problem.scale.size() == start.size());
  const Engine engine(problem);
  const Index all = static_cast<Index>(start.size());
  Descent d = descend(engine, Eigen::Map<const Eigen::VectorXd>(start.data(), all));
  JointFit fit;
  fit.parameters = d.p;
  fit.residuals = d.r;
  fit.chi_square = d.chi_square;
  fit.iterations = d.iterations;
  fit.converged = d.converged;
  fit.covariance = Eigen::MatrixXd::Zero(all, all);
  fit.gain = Eigen::MatrixXd::Zero(all, static_cast<Index>(problem.residual_count));
  fit.open = Eigen::MatrixXd::Zero(all, 0);
  Eigen::MatrixXd j;
  if (!std::isfinite(d.chi_square) || engine.n() == 0 || !engine.jacobian(d.p, j)) return fit;
  // Columns of unit length, so that a direction counts as open by its shape and not by the units.
  Eigen::VectorXd length = j.colwise().norm();
  const double longest = length.maxCoeff();
  for (Index c = 0; c < length.size(); ++c) {
    if (!(length[c] > 1e-9 * longest)) length[c] = std::fmax(longest, 1e-300);
  }
  const Eigen::MatrixXd unit = j * length.cwiseInverse().asDiagonal();
  const Eigen::BDCSVD<Eigen::MatrixXd> svd(unit, Eigen::ComputeThinU | Eigen::ComputeFullV);
  const Eigen::VectorXd& s = svd.singularValues();
  const double largest = s.size() > 0 ? s[0] : 0;
  Eigen::MatrixXd inverse = Eigen::MatrixXd::Zero(engine.n(), j.rows());
  std::vector<Index> open;
  for (Index c = 0; c < engine.n(); ++c) {
    if (c < s.size() && s[c] > kOpen * largest && largest > 0) {
      ++fit.rank;
      inverse += svd.matrixV().col(c) * svd.matrixU().col(c).transpose() / s[c];
    } else {
      open.push_back(c);
    }
  }
  fit.open = Eigen::MatrixXd::Zero(all, static_cast<Index>(open.size()));
  for (Index c = 0; c < engine.n(); ++c) {
    const Index i = engine.parameter(c);
    fit.gain.row(i) = -engine.scale(c) / length[c] * inverse.row(c);
    for (std::size_t k = 0; k < open.size(); ++k) {
      fit.open(i, static_cast<Index>(k)) = svd.matrixV()(c, open[k]) / length[c];
    }
  }
  for (Index k = 0; k < fit.open.cols(); ++k) fit.open.col(k).normalize();
  fit.covariance = fit.gain * fit.gain.transpose();
  return fit;
}

bool determined(const JointFit& fit, std::span<const double> scale, const Eigen::VectorXd& gradient) {
  Eigen::VectorXd slope = gradient;
  for (Index i = 0; i < slope.size(); ++i) slope[i] *= scale[static_cast<std::size_t>(i)];
  if (!slope.allFinite()) return false;
  if (fit.open.cols() == 0) return true;
  return (fit.open.transpose() * slope).cwiseAbs().maxCoeff() < 1e-5 * slope.norm();
}

double promised_drop(const JointProblem& problem, std::span<const double> at) {
  const Engine engine(problem);
  const Eigen::VectorXd p = Eigen::Map<const Eigen::VectorXd>(at.data(), static_cast<Index>(at.size()));
  Eigen::VectorXd r;
  Eigen::MatrixXd j;
  if (engine.n() == 0 || !engine.values(p, r) || !engine.rough_jacobian(p, r, j)) return std::nan("");
  Eigen::VectorXd length = j.colwise().norm();
  for (Index c = 0; c < length.size(); ++c) length[c] = length[c] > 0 ? length[c] : 1;
  const Eigen::MatrixXd unit = j * length.cwiseInverse().asDiagonal();
  Eigen::MatrixXd normal = unit.transpose() * unit;
  normal.diagonal().array() += 1e-10;   // open directions promise nothing
  const Eigen::VectorXd slope = unit.transpose() * r;
  return slope.dot(normal.ldlt().solve(slope));
}

double profile_chi_square(const JointProblem& problem, const JointFit& fit, std::size_t parameter, double value) {
  JointProblem held = problem;
  if (held.fixed.empty()) held.fixed.assign(problem.scale.size(), false);
  held.fixed[parameter] = true;
  const Engine engine(held);
  // The others start where the quadratic says that they go along.
  Eigen::VectorXd start = fit.parameters;
  const Index j = static_cast<Index>(parameter);
  const double variance = fit.covariance(j, j);
  if (variance > 0) start += fit.covariance.col(j) / variance * (value - fit.parameters[j]);
  start[j] = value;
  Descent d = descend(engine, start);
  if (!std::isfinite(d.chi_square)) {
    start = fit.parameters;
    start[j] = value;
    d = descend(engine, start);
  }
  return d.chi_square;
}

}  // namespace coilassay

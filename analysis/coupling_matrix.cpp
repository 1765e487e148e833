#include "analysis/coupling_matrix.h"

#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>

#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/joint_fit.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr std::size_t kMostWindings = 12;
constexpr std::size_t kMostPoints = 100;
constexpr double kLeastNoise = 1e-6;
constexpr double kSeen = 20;   // drop of chi-square by which capacitances are believed

double smallest_eigenvalue(const Eigen::MatrixXd& k) {
  return Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(k, Eigen::EigenvaluesOnly).eigenvalues().minCoeff();
}

Eigen::MatrixXd matrix_of(const std::vector<std::vector<double>>& rows) {
  const Eigen::Index n = static_cast<Eigen::Index>(rows.size());
  Eigen::MatrixXd m(n, n);
  for (Eigen::Index i = 0; i < n; ++i) {
    for (Eigen::Index j = 0; j < n; ++j) m(i, j) = rows[static_cast<std::size_t>(i)][static_cast<std::size_t>(j)];
  }
  return m;
}

/// Unknowns: ln L_i, then k_ij of i < j, then R_i, then C_i.
class Windings {
 public:
  explicit Windings(const Sweep& sweep) : n_(sweep.ports) {
    const std::size_t step = std::max<std::size_t>(1, sweep.frequency_hz.size() / kMostPoints);
    for (std::size_t i = 0; i < sweep.frequency_hz.size(); i += step) {
      const bool marked = i < sweep.bad.size() && sweep.bad[i];
      const bool fine = std::all_of(sweep.z_ohm[i].begin(), sweep.z_ohm[i].end(), [](Complex z) {
        return std::isfinite(z.real()) && std::isfinite(z.imag()) && std::abs(z) > 0;
      });
      if (marked || !fine || !(sweep.frequency_hz[i] > 0)) continue;
      points_.emplace_back(kTwoPi * sweep.frequency_hz[i], sweep.z_ohm[i]);
    }
    std::sort(points_.begin(), points_.end(), [](const auto& a, const auto& b) { return a.first < b.first; });
    noise();
  }

  std::size_t points() const { return points_.size(); }
  std::size_t pairs() const { return n_ * (n_ - 1) / 2; }
  std::size_t unknowns() const { return 3 * n_ + pairs(); }
  std::size_t pair(std::size_t i, std::size_t j) const {
    std::size_t at = n_;
    for (std::size_t a = 0; a < i; ++a) at += n_ - 1 - a;
    return at + j - i - 1;
  }
  std::size_t resistance(std::size_t i) const { return n_ + pairs() + i; }
  std::size_t capacitance(std::size_t i) const { return 2 * n_ + pairs() + i; }

  std::vector<double> start() const {
    std::vector<double> x(unknowns(), 0.0);
    const auto& [omega, z] = points_.front();
    for (std::size_t i = 0; i < n_; ++i) {
      x[i] = std::log(std::fmax(z[i * n_ + i].imag() / omega, 1e-12));
      x[resistance(i)] = std::fmax(z[i * n_ + i].real(), 0);
    }
    for (std::size_t i = 0; i < n_; ++i) {
      for (std::size_t j = i + 1; j < n_; ++j) x[pair(i, j)] = z[i * n_ + j].imag() / omega / std::exp((x[i] + x[j]) / 2);
    }
    return x;
  }
  std::vector<double> scale() const {
    const std::vector<double> x = start();
    std::vector<double> s(unknowns(), 1.0);
    const double omega = points_.back().first;
    for (std::size_t i = 0; i < n_; ++i) {
      s[resistance(i)] = 1e-2 * omega * std::exp(x[i]);
      s[capacitance(i)] = 0.1 / (omega * omega * std::exp(x[i]));
    }
    for (std::size_t p = n_; p < n_ + pairs(); ++p) s[p] = 0.1;
    return s;
  }

  std::size_t rows() const { return points_.size() * n_ * n_ * 2; }
  bool residuals(std::span<const double> x, std::span<double> r) const {
    const Eigen::Index n = static_cast<Eigen::Index>(n_);
    std::size_t at = 0;
    Eigen::MatrixXcd z(n, n), y(n, n);
    for (const auto& [omega, seen] : points_) {
      for (std::size_t i = 0; i < n_; ++i) {
        for (std::size_t j = 0; j < n_; ++j) {
          const double coupling = i == j ? 1 : x[i < j ? pair(i, j) : pair(j, i)];
          z(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(j)) =
              Complex(i == j ? x[resistance(i)] : 0, omega * coupling * std::exp((x[i] + x[j]) / 2));
        }
      }
      y = z.inverse();
      for (std::size_t i = 0; i < n_; ++i) y(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(i)) += Complex(0, omega * x[capacitance(i)]);
      z = y.inverse();
      for (std::size_t i = 0; i < n_; ++i) {
        for (std::size_t j = 0; j < n_; ++j) {
          const Complex left = (seen[i * n_ + j] - z(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(j))) / (omega * Complex(0, 1));
          const double u = u_[i * n_ + j];
          r[at++] = left.real() / u;
          r[at++] = left.imag() / u;
        }
      }
    }
    return std::all_of(r.begin(), r.end(), [](double v) { return std::isfinite(v); });
  }

 private:
  /// Of each element as an inductance, from third differences; no less than a millionth of the windings'.
  void noise() {
    u_.assign(n_ * n_, 1e-9);
    for (std::size_t e = 0; e < n_ * n_; ++e) {
      double sum = 0, size = 0;
      std::size_t count = 0;
      for (std::size_t i = 0; i < points_.size(); ++i) {
        const auto l = [&](std::size_t p) { return points_[p].second[e] / points_[p].first; };
        size += std::abs(l(i));
        if (i < 3) continue;
        sum += std::norm(l(i) - 3.0 * l(i - 1) + 3.0 * l(i - 2) - l(i - 3));
        ++count;
      }
      size /= std::fmax(static_cast<double>(points_.size()), 1);
      u_[e] = std::fmax(kLeastNoise * size, count > 3 ? std::sqrt(sum / (40 * static_cast<double>(count))) : 1e-3 * size);
    }
  }

  std::size_t n_;
  std::vector<std::pair<double, std::vector<Complex>>> points_;
  std::vector<double> u_;
};

}  // namespace

CouplingMatrixJudgement judge_coupling_matrix(const std::vector<std::vector<double>>& coupling) {
  CouplingMatrixJudgement judgement;
  const Eigen::MatrixXd k = matrix_of(coupling);
  judgement.smallest_eigenvalue = smallest_eigenvalue(k);
  if (judgement.smallest_eigenvalue >= 0) return judgement;
  double least = HUGE_VAL;
  for (Eigen::Index i = 0; i < k.rows(); ++i) {
    for (Eigen::Index j = i + 1; j < k.cols(); ++j) {
      Eigen::MatrixXd changed = k;
      const auto at = [&](double value) {
        changed(i, j) = changed(j, i) = value;
        return smallest_eigenvalue(changed);
      };
      // The smallest eigenvalue is a concave function of one coupling: first its top, then the way back.
      double a = -1, b = 1;
      for (int step = 0; step < 80; ++step) {
        const double left = a + (b - a) / 3, right = b - (b - a) / 3;
        (at(left) < at(right) ? a : b) = at(left) < at(right) ? left : right;
      }
      double good = (a + b) / 2, bad = k(i, j);
      if (at(good) < 0) continue;
      for (int step = 0; step < 60; ++step) {
        const double middle = (good + bad) / 2;
        (at(middle) >= 0 ? good : bad) = middle;
      }
      if (std::fabs(good - k(i, j)) < least) {
        least = std::fabs(good - k(i, j));
        judgement.breaker = std::pair{static_cast<std::size_t>(i), static_cast<std::size_t>(j)};
        judgement.nearest = good;
      }
    }
  }
  return judgement;
}

void judge_matrices(Measurement& result, InductanceMatrices m) {
  const CouplingMatrixJudgement judgement = judge_coupling_matrix(m.coupling);
  m.positive_definite = judgement.smallest_eigenvalue > 0;
  if (!m.positive_definite) {
    std::string which = "no single pair alone explains it";
    if (judgement.breaker) {
      const auto [i, j] = *judgement.breaker;
      which = "the coupling of windings " + m.ports[i] + " and " + m.ports[j] + " breaks it: " + to_text(m.coupling[i][j], Unit::one, Script::utf8, 3) +
              " was found, and " + to_text(judgement.nearest, Unit::one, Script::utf8, 3) + " would be the nearest that is possible";
    }
    result.findings.push_back({"not_positive_definite", Severity::caution,
                               "no real windings have these inductances, for some currents would store negative energy; " + which +
                                   ". Look at the polarity and the connections of that pair",
                               "M", judgement.smallest_eigenvalue, Unit::one});
  }
  result.matrices = std::move(m);
}

void add_matrices(Measurement& result, const Sweep& sweep, const CouplingRequest& request) {
  const std::size_t n = sweep.ports;
  if (n > kMostWindings) {
    result.findings.push_back({"too_many_windings", Severity::caution,
                               "the file has " + std::to_string(n) + " ports, and matrices are fitted for at most " + std::to_string(kMostWindings),
                               "", static_cast<double>(n), Unit::one});
    return;
  }
  const Windings windings(sweep);
  if (windings.points() < 2) return;
  JointProblem problem;
  problem.residual_count = windings.rows();
  problem.residuals = [&windings](std::span<const double> x, std::span<double> r) { return windings.residuals(x, r); };
  problem.scale = windings.scale();
  problem.fixed.assign(windings.unknowns(), false);
  for (std::size_t i = 0; i < n; ++i) problem.fixed[windings.capacitance(i)] = true;
  JointFit fit = fit_jointly(problem, windings.start());
  if (windings.points() >= 3) {
    JointProblem more = problem;
    for (std::size_t i = 0; i < n; ++i) more.fixed[windings.capacitance(i)] = false;
    JointFit with = fit_jointly(more, {fit.parameters.data(), static_cast<std::size_t>(fit.parameters.size())});
    if (with.chi_square < fit.chi_square - kSeen) fit = std::move(with);
  }
  const double degrees = static_cast<double>(fit.residuals.size()) - static_cast<double>(fit.rank);
  const double spread = degrees > 1 ? std::fmax(fit.chi_square / degrees, 1e-6) : 1;
  const std::optional<StatedValue>& accuracy = request.bench.impedance.ratio;
  const double half = accuracy ? accuracy->value : request.propagation.exact_bench ? 0 : coupling_defaults::kSweepRatio;

  InductanceMatrices m;
  for (std::size_t i = 0; i < n; ++i) {
    m.ports.push_back(std::to_string(i + 1));
    std::vector<double> l, u, k;
    for (std::size_t j = 0; j < n; ++j) {
      const std::size_t a = std::min(i, j), b = std::max(i, j);
      const Eigen::Index la = static_cast<Eigen::Index>(a), lb = static_cast<Eigen::Index>(b);
      const double middle = std::exp((fit.parameters[la] + fit.parameters[lb]) / 2);
      Eigen::VectorXd gradient = Eigen::VectorXd::Zero(fit.parameters.size());
      double coupling = 1;
      if (a == b) {
        gradient[la] = middle;
      } else {
        const Eigen::Index at = static_cast<Eigen::Index>(windings.pair(a, b));
        coupling = fit.parameters[at];
        gradient[la] = gradient[lb] = coupling * middle / 2;
        gradient[at] = middle;
      }
      const double noise = std::sqrt(std::fmax(gradient.dot(fit.covariance * gradient), 0) * spread);
      const double shared = half / std::sqrt(3.0) * std::fabs(coupling) * middle;
      const ErrorLaw laws[] = {{ErrorLaw::Kind::normal, noise, 0}, {ErrorLaw::Kind::rectangular, shared, 0}};
      l.push_back(coupling * middle);
      k.push_back(coupling);
      u.push_back(coverage_factor(laws) * std::hypot(noise, shared));
    }
    m.inductance_h.push_back(std::move(l));
    m.U_h.push_back(std::move(u));
    m.coupling.push_back(std::move(k));
  }
  Table table{"windings", {{"resistance_ohm", Unit::ohm, {}}, {"capacitance_F", Unit::farad, {}}}};
  for (std::size_t i = 0; i < n; ++i) {
    table.columns[0].values.push_back(std::fmax(fit.parameters[static_cast<Eigen::Index>(windings.resistance(i))], 0));
    table.columns[1].values.push_back(std::fmax(fit.parameters[static_cast<Eigen::Index>(windings.capacitance(i))], 0));
  }
  result.tables.push_back(std::move(table));
  judge_matrices(result, std::move(m));
}

}  // namespace coilassay

#include "fitting/kramers_kronig.h"

#include <Eigen/QR>
#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <utility>

#include "fitting/circuit_equations.h"
#include "fitting/circuit_outliers.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
using Matrix = Eigen::MatrixXd;
using Vector = Eigen::VectorXd;
constexpr double kFalseAlarms = 1.0 / 2000;
constexpr std::size_t kFewestPoints = 12;
constexpr double kMu = 0.85;                  // Schoenleber's limit
constexpr std::array<std::size_t, 9> kElements = {1, 2, 3, 5, 7, 10, 14, 20, 28};
constexpr std::size_t kMostRounds = 40;
constexpr double kCircuitWidth = 0.1;          // of the law of a change of the logarithm of a parameter ...
constexpr double kRelaxationWidth = 10;        // ... and of a coefficient in ln z
constexpr std::size_t kRow = 2;                // points off together that may be a resonance
constexpr std::size_t kMostResonances = 4;
constexpr double kPlainGain = 20;              // of chi-square
constexpr double kLeastRest = 0.02;           // variance a residual must keep to say anything

struct Resonance {
  double omega = 1, damping = 1;
};

/// The test's equations: whitened rho of every point, and the columns that do not change.
class LogarithmEquations {
 public:
  LogarithmEquations(const CircuitData& data, const std::vector<std::size_t>& points, const Circuit& about)
      : equations_(data, points, false), about_(about), y_(rows(points.size())), share_(points.size(), 1.0) {
    if (data.errors == SweepErrors::reflection) reference_ = data.reference_ohm;
    for (std::size_t i = 0; i < points.size(); ++i) omega_.push_back(2 * std::numbers::pi * equations_.frequency_hz(i));
    look();
  }

  /// The circuit with its parameters moved by what a solution says; columns are slopes and hold near the circuit only.
  void move(const Vector& solution) {
    const auto order = parameters_of(about_.family);
    for (std::size_t k = 0; k < order.size(); ++k) {
      double& value = about_[order[k]];
      value *= std::exp(std::clamp(solution[kBroad + static_cast<Eigen::Index>(k)], -1.0, 1.0));
      if (order[k] == CircuitParameter::relaxation_share) value = std::fmin(value, 1.0);
    }
    look();
  }
  const Circuit& about() const { return about_; }
  void move_to(const Circuit& about) {
    about_ = about;
    look();
  }

  /// A further resonance: what the logarithm of a pole and a zero close to it adds, to first order two real coefficients
  /// times 1/(1 - x^2 + j D x) and j x of it, x = omega/omega_0.
  void add_resonance(const Resonance& resonance) {
    resonances_.push_back(resonance);
    fixed_.conservativeResize(Eigen::NoChange, fixed_.cols() + 2);
    put_resonance(resonances_.size() - 1);
  }
  void drop_resonance() {
    resonances_.pop_back();
    fixed_.conservativeResize(Eigen::NoChange, fixed_.cols() - 2);
  }
  /// Half the logarithm of the ratio of the neighbours' frequencies.
  double spacing(std::size_t i) const {
    const std::size_t a = i == 0 ? 0 : i - 1, b = std::min(i + 1, size() - 1);
    return std::log(omega_[b] / omega_[a]) / static_cast<double>(b - a);
  }
  double omega(std::size_t i) const { return omega_[i]; }

  static constexpr Eigen::Index kBroad = 3;   // columns of the constant and of what lies outside the sweep
  static Eigen::Index row(std::size_t i) { return 2 * static_cast<Eigen::Index>(i); }
  static Eigen::Index rows(std::size_t n) { return 2 * static_cast<Eigen::Index>(n); }
  std::size_t size() const { return omega_.size(); }
  const Vector& y() const { return y_; }
  Eigen::Index fixed_columns() const { return fixed_.cols(); }
  Eigen::Index circuit_columns() const { return static_cast<Eigen::Index>(parameters_of(about_.family).size()); }
  double frequency_hz(std::size_t i) const { return equations_.frequency_hz(i); }
  Complex unwhitened(std::size_t i, Complex r) const { return equations_.unwhitened(i, r); }

  /// Columns with `elements` relaxations, the relaxations last.
  Matrix columns(std::size_t elements) const {
    Matrix a(fixed_.rows(), fixed_.cols() + static_cast<Eigen::Index>(elements));
    a.leftCols(fixed_.cols()) = fixed_;
    const double first = 1 / (3 * omega_.back()), last = 3 / omega_.front();
    for (std::size_t k = 0; k < elements; ++k) {
      const double tau = first * std::pow(last / first, (static_cast<double>(k) + 0.5) / static_cast<double>(elements));
      for (std::size_t i = 0; i < size(); ++i) put(a, i, fixed_.cols() + static_cast<Eigen::Index>(k), 1.0 / Complex(1, omega_[i] * tau));
    }
    return a;
  }

 private:
  /// rho and the columns that are always there, at the circuit as it is.
  void look() {
    const std::size_t n = size();
    const std::size_t parameters = parameters_of(about_.family).size();
    std::array<double, kCircuitParameters> unit{};
    std::array<Complex, kCircuitParameters> slope;
    for (std::size_t k = 0; k < parameters; ++k) unit[k] = about_[parameters_of(about_.family)[k]];
    fixed_.resize(rows(n), kBroad + static_cast<Eigen::Index>(parameters + 2 * resonances_.size()));
    for (std::size_t i = 0; i < n; ++i) {
      const Complex r = -equations_.residual(about_, i);
      y_[row(i)] = r.real();
      y_[row(i) + 1] = r.imag();
      const Complex z = impedance_and_log_slopes(about_, equations_.frequency_hz(i), slope);
      if (reference_ > 0) share_[i] = 2 * reference_ * z / ((z + reference_) * (z + reference_));
      for (std::size_t k = 0; k < parameters; ++k) put(fixed_, i, kBroad + static_cast<Eigen::Index>(k), unit[k] * slope[k]);
      put(fixed_, i, 0, 1.0);
      put(fixed_, i, 1, Complex(0, omega_[i] / omega_.back()));
      put(fixed_, i, 2, Complex(0, -omega_.front() / omega_[i]));
    }
    for (std::size_t k = 0; k < resonances_.size(); ++k) put_resonance(k);
  }

  void put_resonance(std::size_t k) {
    const Eigen::Index column = kBroad + circuit_columns() + 2 * static_cast<Eigen::Index>(k);
    for (std::size_t i = 0; i < size(); ++i) {
      const double x = omega_[i] / resonances_[k].omega;
      const Complex tank = resonances_[k].damping / Complex(1 - x * x, resonances_[k].damping * x);
      put(fixed_, i, column, tank);
      put(fixed_, i, column + 1, Complex(0, x) * tank);
    }
  }

  void put(Matrix& a, std::size_t i, Eigen::Index column, Complex value) const {
    const Complex w = equations_.whitened(i, value * share_[i]);
    a(row(i), column) = w.real();
    a(row(i) + 1, column) = w.imag();
  }


  CircuitEquations equations_;
  Circuit about_;
  Matrix fixed_;
  Vector y_;
  std::vector<double> omega_;
  double reference_ = 0;            // of S; 0: errors are alike in ln z
  std::vector<Complex> share_;      // dS/d ln z, or 1
  std::vector<Resonance> resonances_;
};

struct Solved {
  Vector coefficients;
  Vector residual;        // all rows; of rows left out: what the others predict
  std::vector<Eigen::Matrix2d> rest;   // covariance of the residual of each point: 1 less its leverage
  double chi = 0, dof = 0, mu = 1;
  std::size_t elements = 0;
};

Solved solve(const LogarithmEquations& equations, const std::vector<bool>& used, std::size_t elements) {
  Solved s;
  s.elements = elements;
  const Matrix all = equations.columns(elements);
  const Eigen::Index count = all.cols();
  // Columns that are nearly alike (close relaxations; a change of scale of the circuit and the constant) are told apart by wide
  // laws around 0, as further rows; where the data speak these weigh nothing.
  Matrix a = Matrix::Zero(all.rows() + count, count);
  a.topRows(all.rows()) = all;
  Vector y = Vector::Zero(a.rows());
  y.head(all.rows()) = equations.y();
  for (Eigen::Index k = 0; k < count; ++k) {
    const bool of_circuit = k >= LogarithmEquations::kBroad && k < LogarithmEquations::kBroad + equations.circuit_columns();
    a(all.rows() + k, k) = 1 / (of_circuit ? kCircuitWidth : kRelaxationWidth);
  }
  double rows = 0;
  for (std::size_t i = 0; i < equations.size(); ++i) {
    const Eigen::Index r = LogarithmEquations::row(i);
    if (used[i]) rows += 2;
    else a.middleRows<2>(r).setZero(), y.segment<2>(r).setZero();
  }
  const Eigen::HouseholderQR<Matrix> qr(a);
  s.coefficients = qr.solve(y);
  s.residual = equations.y() - all * s.coefficients;
  const Matrix q = qr.householderQ() * Matrix::Identity(a.rows(), count);
  double leverage = 0;
  for (std::size_t i = 0; i < equations.size(); ++i) {
    const auto rows_of_point = q.middleRows<2>(LogarithmEquations::row(i));
    s.rest.push_back(Eigen::Matrix2d::Identity() - rows_of_point * rows_of_point.transpose());
    leverage += 2 - s.rest.back().trace();
  }
  double positive = 0, negative = 0;
  for (std::size_t k = 0; k < elements; ++k) {
    const Eigen::Index column = equations.fixed_columns() + static_cast<Eigen::Index>(k);
    const double c = s.coefficients[column];
    (c < 0 ? negative : positive) += std::fabs(c);
  }
  if (elements > 0) s.mu = positive > 0 ? std::fmax(1 - negative / positive, -1) : -1;
  for (std::size_t i = 0; i < equations.size(); ++i) {
    if (used[i]) s.chi += s.residual.segment<2>(LogarithmEquations::row(i)).squaredNorm();
  }
  s.dof = rows - leverage;
  return s;
}

/// More elements while chi-square falls by more than ln n for each, and while mu leaves room.
Solved grown(LogarithmEquations& equations, const std::vector<bool>& used, bool scale_known) {
  const double n = 2 * static_cast<double>(equations.size());
  Solved best;
  double least = HUGE_VAL;
  for (const std::size_t elements : kElements) {
    if (static_cast<double>(elements + static_cast<std::size_t>(equations.fixed_columns())) > n / 3) break;
    const Solved next = solve(equations, used, elements);
    const double cost = (scale_known ? next.chi : n * std::log(std::fmax(next.chi, 1e-300))) + static_cast<double>(elements) * std::log(n);
    if (elements == kElements.front() || cost < least || (next.mu > kMu && best.elements < 3)) {
      least = std::fmin(cost, least);
      best = next;
    } else if (elements > 3 * best.elements + 4) {
      break;
    }
  }
  // A narrow resonance bends within its own uncertainty: follow it.
  for (int round = 0; round < 2; ++round) {
    const Circuit before = equations.about();
    equations.move(best.coefficients);
    const Solved next = solve(equations, used, best.elements);
    if (!(next.chi <= best.chi * (1 + 1e-6))) {   // further than its slopes hold
      equations.move_to(before);
      break;
    }
    best = next;
  }
  return best;
}

/// Residuals of the points used, each of unit variance where the errors have it.
std::vector<Complex> even_residuals(const Solved& s, const std::vector<bool>& used) {
  std::vector<Complex> list;
  for (std::size_t i = 0; i < used.size(); ++i) {
    if (!used[i]) continue;
    const Eigen::Index r = LogarithmEquations::row(i);
    const double real = std::sqrt(std::fmax(s.rest[i](0, 0), kLeastRest)), imaginary = std::sqrt(std::fmax(s.rest[i](1, 1), kLeastRest));
    list.emplace_back(s.residual[r] / real, s.residual[r + 1] / imaginary);
  }
  return list;
}

/// Squared residual of each point in units of its own covariance and of sigma^2.
double surprise(const Solved& s, std::size_t i, double sigma) {
  const Eigen::Vector2d r = s.residual.segment<2>(LogarithmEquations::row(i));
  // Eigenvalues of the covariance: a direction in which the point all but determines itself says nothing.
  const double a = s.rest[i](0, 0), b = s.rest[i](0, 1), c = s.rest[i](1, 1);
  const double middle = (a + c) / 2, half = std::hypot((a - c) / 2, b);
  const double angle = 0.5 * std::atan2(2 * b, a - c);
  const double along = std::cos(angle) * r[0] + std::sin(angle) * r[1], across = std::cos(angle) * r[1] - std::sin(angle) * r[0];
  double sum = 0;
  if (middle + half > kLeastRest) sum += along * along / (middle + half);
  if (middle - half > kLeastRest) sum += across * across / (middle - half);
  return sum / (sigma * sigma);
}

/// Probability of residuals of neighbours so alike by chance.
double likeness_probability(const std::vector<Complex>& residuals) {
  std::vector<double> real, imaginary;
  for (const Complex& r : residuals) {
    real.push_back(r.real());
    imaginary.push_back(r.imag());
  }
  const double n = static_cast<double>(real.size());
  return 1 - normal_cdf((lag_one_correlation(real) + lag_one_correlation(imaginary)) * std::sqrt(n / 2));
}

struct Judged {
  Solved solved;
  double sigma = 1;
};

/// Takes out points that lie off, the worst first, until none does.
Judged judge(LogarithmEquations& equations, std::vector<bool>& used, bool scale_known) {
  Judged now;
  const double limit = worst_by_chance(used.size(), kFalseAlarms, scale_known);
  for (std::size_t round = 0; round < kMostRounds; ++round) {
    now.solved = grown(equations, used, scale_known);
    if (!scale_known) now.sigma = neighbour_noise(even_residuals(now.solved, used));
    if (!(now.sigma > 0)) break;
    double worst = limit;
    for (std::size_t i = 0; i < used.size(); ++i) {
      if (used[i]) worst = std::fmax(worst, surprise(now.solved, i, now.sigma));
    }
    std::size_t removed = 0;
    for (std::size_t i = 0; i < used.size(); ++i) {
      // Those much like the worst go with it; lesser ones may only be in its shadow.
      if (used[i] && surprise(now.solved, i, now.sigma) > std::fmax(limit, 0.3 * worst)) used[i] = false, ++removed;
    }
    if (removed == 0 || std::count(used.begin(), used.end(), true) < static_cast<std::ptrdiff_t>(kFewestPoints)) break;
  }
  return now;
}

/// The longest row of neighbours taken out, with gaps of one: [first, end).
std::pair<std::size_t, std::size_t> longest_row(const std::vector<bool>& used) {
  std::pair<std::size_t, std::size_t> best{0, 0};
  for (std::size_t a = 0; a < used.size(); ++a) {
    if (used[a]) continue;
    std::size_t b = a + 1, out = 1;
    for (std::size_t k = b; k < used.size() && k < b + 2; ++k) {
      if (!used[k]) b = k + 1, ++out;
    }
    if (out >= kRow && b - a > best.second - best.first) best = {a, b};
    a = b;
  }
  return best;
}

/// Adds the resonance that helps most near a row of points, when it helps far more than chance. Its width is never less than two
/// steps of the sweep: a single point is not explained by it.
bool add_resonance(LogarithmEquations& equations, const std::vector<bool>& used, std::pair<std::size_t, std::size_t> row, const Judged& now) {
  const double before = solve(equations, used, now.solved.elements).chi;
  const double spacing = equations.spacing((row.first + row.second) / 2), narrowest = 2 * spacing;
  double least = HUGE_VAL;
  Resonance best;
  const auto look = [&](const Resonance& trial) {
    equations.add_resonance(trial);
    const double chi = solve(equations, used, now.solved.elements).chi;
    equations.drop_resonance();
    if (!(chi < least)) return false;
    least = chi;
    best = trial;
    return true;
  };
  for (std::size_t i = row.first; i < row.second; i += std::max<std::size_t>(1, (row.second - row.first) / 4)) {
    for (const double damping : {narrowest, 3 * narrowest, 10 * narrowest}) look({equations.omega(i), damping});
  }
  for (double step = 1; step > 0.02;) {
    const Resonance from = best;
    bool better = false;
    for (const double side : {-1.0, 1.0}) {
      better = look({from.omega * std::exp(side * step * spacing), from.damping}) || better;
      better = look({from.omega, std::fmax(from.damping * std::exp(side * step), narrowest)}) || better;
    }
    if (!better) step *= 0.4;
  }
  const double n = 2 * static_cast<double>(used.size());
  if (before - least < (4 * std::log(n) + kPlainGain) * now.sigma * now.sigma) return false;
  equations.add_resonance(best);
  return true;
}

}  // namespace

Result<KramersKronig> test_kramers_kronig(const CircuitData& data, const std::optional<Circuit>& about) {
  const auto points = usable_points(data);
  bool phase = data.errors == SweepErrors::reflection || data.u_phase.empty();
  for (const double u : data.u_phase) phase = phase || std::isfinite(u);
  if (points.size() < kFewestPoints || !phase) {
    return failure(Problem::too_few_samples, "causality test",
                   phase ? std::to_string(points.size()) + " usable points" : "no phase was measured",
                   "the test needs modulus and phase at 12 frequencies or more");
  }
  std::optional<Circuit> circuit = about;
  if (!circuit) {
    auto choice = choose_circuit(data);
    if (!choice) return failure(choice);
    circuit = choice->best.circuit;
  }
  LogarithmEquations equations(data, points, *circuit);
  std::vector<bool> used(points.size(), true);
  KramersKronig result;
  Judged judged = judge(equations, used, data.scale_known);
  // Several neighbours off together may be a resonance that the circuit lacks, and causal all the same.
  for (std::size_t k = 0; k < kMostResonances; ++k) {
    const auto row = longest_row(used);
    if (row.second == row.first || 4 * (row.second - row.first) > used.size()) break;
    for (std::size_t i = row.first; i < row.second; ++i) used[i] = true;
    const bool added = add_resonance(equations, used, row, judged);
    judged = judge(equations, used, data.scale_known);
    if (!added) break;
  }
  const Solved& solved = judged.solved;
  const double sigma = judged.sigma;
  for (std::size_t i = 0; i < points.size(); ++i) {
    const Eigen::Index r = LogarithmEquations::row(i);
    result.frequency_hz.push_back(equations.frequency_hz(i));
    result.index.push_back(points[i]);
    result.residual.push_back(equations.unwhitened(i, {solved.residual[r], solved.residual[r + 1]}));
    const Complex one = equations.unwhitened(i, {sigma, sigma});
    result.predicted_u.push_back(std::abs(one) / std::sqrt(2.0));
    if (!used[i]) result.not_causal.push_back(points[i]);
  }
  std::sort(result.not_causal.begin(), result.not_causal.end());
  result.elements = solved.elements;
  result.mu = solved.mu;
  result.chi_square = solved.chi;
  result.dof = solved.dof;
  result.scale = sigma;
  result.probability = likeness_probability(even_residuals(solved, used));
  if (data.scale_known) result.probability = std::fmin(1, 2 * std::fmin(result.probability, f_upper_tail(solved.chi / solved.dof, solved.dof, HUGE_VAL)));
  result.passed = result.not_causal.empty() && result.probability >= kFalseAlarms;
  return result;
}

}  // namespace coilassay

// The law of a sum from its characteristic function: that of a sum is the product of those of its terms, and a Fourier
// series over an interval wide enough for the tails gives the probability. For symmetric errors everything is real:
//   P(|S| <= x) = x/L + sum over n of 2/(pi n) phi(pi n/L) sin(pi n x/L),  S within [-L, L] but for what can be neglected.
// A rectangular term makes the terms of the series fall as 1/n^2 at least; every other law far faster.
#include "fitting/propagation.h"

#include <algorithm>
#include <boost/math/special_functions/bessel.hpp>
#include <cassert>
#include <cmath>
#include <complex>
#include <limits>
#include <numbers>
#include <numeric>

#include "fitting/statistics.h"

namespace coilassay {
namespace {

using std::numbers::pi;

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();

double rectangular_half_width(const ErrorLaw& law) { return std::sqrt(3.0) * law.standard_uncertainty; }

/// Student's law of scale s: characteristic function K_h(z) z^h / (2^(h-1) Gamma(h)), h = dof/2, z = sqrt(dof) s t, and the
/// power law of its tail, density tail_amplitude() / x^(dof + 1).
class Student {
 public:
  explicit Student(const ErrorLaw& law)
      : dof_(law.dof),
        half_dof_(law.dof / 2),
        scale_(law.standard_uncertainty),
        stretch_(std::sqrt(law.dof) * law.standard_uncertainty),
        log_norm_((half_dof_ - 1) * std::log(2.0) + std::lgamma(half_dof_)),
        log_tail_(std::lgamma((dof_ + 1) / 2) - std::lgamma(half_dof_) - std::log(dof_ * pi) / 2 +
                  (dof_ + 1) / 2 * std::log(dof_)) {}

  double characteristic(double t) const {
    const double z = stretch_ * t;
    if (half_dof_ >= 15) return at_large_order(z);
    if (z > 600) return 0;  // K underflows
    if (half_dof_ == 0.5) return std::exp(-z);
    if (half_dof_ == 1.5) return std::exp(-z) * (1 + z);
    if (half_dof_ == 2.5) return std::exp(-z) * (1 + z + z * z / 3);
    using Quiet = boost::math::policies::policy<
        boost::math::policies::promote_double<false>,
        boost::math::policies::overflow_error<boost::math::policies::ignore_error>,
        boost::math::policies::evaluation_error<boost::math::policies::ignore_error>>;
    const double k = boost::math::cyl_bessel_k(half_dof_, z, Quiet());
    if (!std::isfinite(k)) return 1;  // only next to t = 0
    return k > 0 ? std::exp(std::log(k) + half_dof_ * std::log(z) - log_norm_) : 0;
  }

  /// How far out the density, for a scale of one, falls to a millionth.
  double reach() const { return scale_ * std::min(1e5, std::exp((log_tail_ + std::log(1e6)) / (dof_ + 1))); }

  /// What the tails beyond the first period of the series add to the probability inside x: they are folded back there.
  double folded(double x, double period) const {
    double sum = 0;
    for (int m = 1; m <= 10; ++m) sum += std::pow(m, -dof_ - 1);
    sum += std::pow(10.5, -dof_) / dof_;  // the rest of the zeta function, as an integral
    return 4 * x * sum * std::exp(log_tail_ + dof_ * std::log(scale_) - (dof_ + 1) * std::log(period));
  }

 private:
  /// Debye's expansion of K for large order (Abramowitz and Stegun 9.7.8, from memory, checked against the direct
  /// form), divided by its own value at 0; what is left out is below 1e-5 from h = 15 on.
  double at_large_order(double z) const {
    const double h = half_dof_, root = std::hypot(1.0, z / h), p = 1 / root;
    const auto series = [h](double q) {
      const double q2 = q * q;
      const double u1 = q * (3 - 5 * q2) / 24;
      const double u2 = q2 * (81 - 462 * q2 + 385 * q2 * q2) / 1152;
      return 1 - u1 / h + u2 / (h * h);
    };
    return std::exp(-h * (root - 1 - std::log1p((root - 1) / 2))) * std::sqrt(p) * series(p) / series(1);
  }

  double dof_, half_dof_, scale_, stretch_, log_norm_, log_tail_;
};

/// The terms of the sum, sorted by how they are handled.
struct Sum {
  double normal_variance = 0;
  std::vector<double> half_widths;      // of rectangular terms
  std::vector<Student> students;

  bool is_normal() const { return half_widths.empty() && students.empty(); }
};

/// Terms of together less than this share of the variance are taken as normal.
constexpr double kSmallShare = 2e-4;
/// From here on a t law is taken as the normal law of the same variance.
constexpr double kManyDof = 1e4;

Sum sorted_out(std::vector<ErrorLaw> terms) {
  double total = 0;
  for (const ErrorLaw& term : terms) total += term.standard_uncertainty * term.standard_uncertainty;
  std::sort(terms.begin(), terms.end(), [](const ErrorLaw& a, const ErrorLaw& b) {
    return a.standard_uncertainty < b.standard_uncertainty;
  });
  Sum sum;
  double small = 0;
  for (const ErrorLaw& term : terms) {
    const double variance = term.standard_uncertainty * term.standard_uncertainty;
    const bool heavy_tail = term.kind == ErrorLaw::Kind::student_t && term.dof < kManyDof;
    if (!heavy_tail && small + variance < kSmallShare * total) {
      small += variance;
      sum.normal_variance += variance;
      continue;
    }
    switch (term.kind) {
      case ErrorLaw::Kind::normal: sum.normal_variance += variance; break;
      case ErrorLaw::Kind::rectangular: sum.half_widths.push_back(rectangular_half_width(term)); break;
      case ErrorLaw::Kind::triangular:  // the sum of two equal rectangular errors
        sum.half_widths.insert(sum.half_widths.end(), 2, rectangular_half_width(term) / std::numbers::sqrt2);
        break;
      case ErrorLaw::Kind::student_t:
        if (heavy_tail) {
          sum.students.emplace_back(term);
        } else {
          sum.normal_variance += std::isinf(term.dof) ? variance : variance * term.dof / (term.dof - 2);
        }
        break;
    }
  }
  return sum;
}

/// The Fourier series of P(|S| <= x).
class InsideProbability {
 public:
  explicit InsideProbability(const Sum& sum) : students_(sum.students) {
    const double sigma = std::sqrt(sum.normal_variance);
    half_period_ = std::accumulate(sum.half_widths.begin(), sum.half_widths.end(), 0.0) + 9 * sigma;
    for (const Student& student : students_) half_period_ += student.reach();
    const double step = pi / half_period_;

    // sin(n a step) by rotation, one per rectangular term.
    std::vector<std::complex<double>> turn, phase(sum.half_widths.size(), 1.0);
    for (const double a : sum.half_widths) turn.push_back(std::polar(1.0, a * step));
    for (int n = 1; n <= kMostTerms; ++n) {
      const double t = n * step;
      double phi = std::exp(-sum.normal_variance * t * t / 2);
      double envelope = phi;
      for (std::size_t i = 0; i < turn.size(); ++i) {
        phase[i] *= turn[i];
        const double z = sum.half_widths[i] * t;
        phi *= phase[i].imag() / z;
        envelope *= std::min(1.0, 1 / z);
      }
      for (const Student& student : students_) {
        if (envelope < kNegligible) break;
        const double factor = student.characteristic(t);
        phi *= factor;
        envelope *= factor;
      }
      if (envelope < kNegligible) break;
      coefficients_.push_back(2 / (pi * n) * phi);
    }
  }

  double half_period() const { return half_period_; }

  double operator()(double x) const {
    const std::complex<double> turn = std::polar(1.0, pi * x / half_period_);
    std::complex<double> phase = 1;
    double p = x / half_period_;
    for (const double c : coefficients_) {
      phase *= turn;
      p += c * phase.imag();
    }
    for (const Student& student : students_) p -= student.folded(x, 2 * half_period_);
    return p;
  }

 private:
  static constexpr int kMostTerms = 8192;
  static constexpr double kNegligible = 1e-7;
  std::vector<Student> students_;
  double half_period_ = 0;
  std::vector<double> coefficients_;
};

/// The x with P(|S| <= x) = confidence, by halving the bracket and false position in turn.
double inside_quantile(const InsideProbability& inside, double confidence, double guess) {
  double low = 0, high = std::min(guess, inside.half_period());
  double at_low = -confidence, at_high = inside(high) - confidence;
  while (at_high < 0 && high < inside.half_period()) {
    low = high;
    at_low = at_high;
    high = std::min(2 * high, inside.half_period());
    at_high = inside(high) - confidence;
  }
  for (int i = 0; i < 60 && high - low > 1e-7 * high; ++i) {
    double x = i % 2 == 0 ? low + (high - low) * at_low / (at_low - at_high) : (low + high) / 2;
    x = std::clamp(x, low, high);
    const double at_x = inside(x) - confidence;
    if (at_x == 0) return x;
    (at_x < 0 ? low : high) = x;
    (at_x < 0 ? at_low : at_high) = at_x;
  }
  return (low + high) / 2;
}

}  // namespace

double coverage_factor(std::span<const ErrorLaw> terms, double confidence) {
  assert(confidence > 0 && confidence < 1);
  std::vector<ErrorLaw> uncertain;
  double largest = 0;
  for (const ErrorLaw& term : terms) {
    if (!(term.standard_uncertainty >= 0) || std::isinf(term.standard_uncertainty)) return kNan;
    if (term.kind == ErrorLaw::Kind::student_t && !(term.dof > 0)) return kNan;
    if (term.standard_uncertainty > 0) uncertain.push_back(term);
    largest = std::max(largest, term.standard_uncertainty);
  }
  if (uncertain.empty()) return 0;

  // The factor does not depend on the unit; henries squared would underflow.
  double variance = 0;
  for (ErrorLaw& term : uncertain) {
    term.standard_uncertainty /= largest;
    variance += term.standard_uncertainty * term.standard_uncertainty;
  }
  const double upper = (1 + confidence) / 2;
  if (uncertain.size() == 1) {
    switch (uncertain.front().kind) {
      case ErrorLaw::Kind::normal: return normal_quantile(upper);
      case ErrorLaw::Kind::rectangular: return confidence * std::sqrt(3.0);
      case ErrorLaw::Kind::triangular: return std::sqrt(6.0) * (1 - std::sqrt(1 - confidence));
      case ErrorLaw::Kind::student_t: return student_t_quantile(upper, uncertain.front().dof);
    }
  }
  const Sum sum = sorted_out(uncertain);
  const double u = std::sqrt(variance);
  if (sum.is_normal()) return normal_quantile(upper) * std::sqrt(sum.normal_variance) / u;
  return inside_quantile(InsideProbability(sum), confidence, 2 * u) / u;
}

double effective_dof(std::span<const ErrorLaw> terms) {
  double largest = 0;
  for (const ErrorLaw& term : terms) largest = std::max(largest, term.standard_uncertainty);
  double variance = 0, share = 0;
  for (const ErrorLaw& term : terms) {
    if (!(term.standard_uncertainty >= 0)) return kNan;
    if (largest == 0) continue;
    const double v = std::pow(term.standard_uncertainty / largest, 2);
    variance += v;
    if (term.kind == ErrorLaw::Kind::student_t) share += v * v / term.dof;
  }
  return share > 0 ? variance * variance / share : std::numeric_limits<double>::infinity();
}

}  // namespace coilassay

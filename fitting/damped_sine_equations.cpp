#include "fitting/damped_sine_equations.h"

#include <ceres/jet.h>

#include <Eigen/Cholesky>
#include <cassert>
#include <cmath>
#include <complex>
#include <numbers>

namespace coilassay {
namespace {

using Jet = ceres::Jet<double, 2>;  // derivatives by a and q

// One step of the recurrence of (e^{-an} C_q, e^{-an} S_q) is the matrix alpha + beta J with J^2 = -q. Such matrices
// multiply like complex numbers do, for either sign of q and through 0.
struct Step {
  Jet alpha, beta;
};
Step product(const Step& x, const Step& y, const Jet& q) {
  return {x.alpha * y.alpha - q * (x.beta * y.beta), x.alpha * y.beta + x.beta * y.alpha};
}

struct ComplexStep {
  Step re, im;
};

// sum of M^m e^{-i omega m}, m < count, by doubling: no division, hence exact at every frequency and decay.
ComplexStep geometric_sum(const Step& one_step, const Jet& q, double omega, std::size_t count) {
  const Jet zero(0.0), one(1.0);
  ComplexStep sum{{one, zero}, {zero, zero}};  // of `terms` terms
  Step power = one_step;                       // M^terms
  std::size_t terms = 1;
  int bit = 63;
  while (((count >> bit) & 1U) == 0) --bit;
  const auto extend = [&](const ComplexStep& part, const Step& factor, std::size_t shift) {
    const Step re = product(part.re, factor, q), im = product(part.im, factor, q);
    const double c = std::cos(omega * static_cast<double>(shift)), s = -std::sin(omega * static_cast<double>(shift));
    sum.re.alpha += re.alpha * c - im.alpha * s;
    sum.re.beta += re.beta * c - im.beta * s;
    sum.im.alpha += re.alpha * s + im.alpha * c;
    sum.im.beta += re.beta * s + im.beta * c;
  };
  for (--bit; bit >= 0; --bit) {
    extend(sum, power, terms);
    power = product(power, power, q);
    terms *= 2;
    if (((count >> bit) & 1U) != 0) {
      extend({{one, zero}, {zero, zero}}, power, terms);
      power = product(power, one_step, q);
      ++terms;
    }
  }
  return sum;
}

// M^n.
Step steps(const Shape& shape, double n) {
  const DampedPair at = damped_pair(shape, n);
  Step step{Jet(at.c), Jet(at.s)};
  step.alpha.v[0] = -n * at.c;
  step.beta.v[0] = -n * at.s;
  step.alpha.v[1] = -n * at.s / 2;
  step.beta.v[1] = damped_sine_slope(shape, n, at);
  return step;
}

// Responses of the white values to the state at the start of a block.
struct Response {
  std::array<Step, 3> of;
};
template <int Modes>
using Responses = std::array<Response, static_cast<std::size_t>(Modes)>;

Response response(const WhiteBlocks& blocks, const Shape& shape) {
  const Step step = steps(shape, 1);
  const Jet q(shape.q, 1);
  const ComplexStep plain = geometric_sum(step, q, 0, blocks.length);
  ComplexStep turned{{Jet(0.0), Jet(0.0)}, {Jet(0.0), Jet(0.0)}};
  if (blocks.omega != 0 && blocks.step == 1) {
    turned = geometric_sum(step, q, blocks.omega, blocks.length);
  } else if (blocks.omega != 0) {
    // Short blocks summed plainly, then turned as a whole.
    const double each = static_cast<double>(blocks.step);
    const Step within = geometric_sum(step, q, 0, blocks.step).re;
    turned = geometric_sum(steps(shape, each), q, blocks.omega * each, blocks.length / blocks.step);
    turned = {product(turned.re, within, q), product(turned.im, within, q)};
  }
  Response result;
  for (int r = 0; r < blocks.rank; ++r) {
    const double re = blocks.whitening(r, 0), im = blocks.whitening(r, 1), sum = blocks.whitening(r, 2);
    result.of[static_cast<std::size_t>(r)] = {turned.re.alpha * re + turned.im.alpha * im + plain.re.alpha * sum,
                                              turned.re.beta * re + turned.im.beta * im + plain.re.beta * sum};
  }
  return result;
}

// (damped C, damped S) from block to block by recurrence, reseeded so that rounding cannot grow.
class Walk {
 public:
  Walk(const Shape& shape, std::size_t length) : shape_(shape), length_(static_cast<double>(length)) {
    step_ = damped_pair(shape, length_);
    now_ = {1, 0};
  }
  const DampedPair& now() const { return now_; }
  void advance(std::size_t next) {
    if (next % 64 == 0) {
      now_ = damped_pair(shape_, static_cast<double>(next) * length_);
    } else {
      now_ = {now_.c * step_.c - shape_.q * now_.s * step_.s, now_.c * step_.s + now_.s * step_.c};
    }
  }

 private:
  Shape shape_;
  double length_;
  DampedPair step_, now_;
};

// Sums over blocks of products of the columns [C, S, nC, nS, dS/dq] of each mode and 1, with each other and the data.
template <int Columns>
struct Products {
  Eigen::Matrix<double, Columns, Columns> gram = Eigen::Matrix<double, Columns, Columns>::Zero();  // lower half
  Eigen::Matrix<double, Columns, 3> data = Eigen::Matrix<double, Columns, 3>::Zero();
};

template <int Modes, int PerMode>
Products<Modes * PerMode + 1> accumulate(const WhiteBlocks& blocks, const Shapes<Modes>& shapes) {
  constexpr std::size_t kColumns = Modes * PerMode + 1;
  double gram[kColumns][kColumns] = {};
  double data[3][kColumns] = {};
  std::vector<Walk> walks;
  for (const Shape& shape : shapes) walks.emplace_back(shape, blocks.length);
  const std::size_t rank = static_cast<std::size_t>(blocks.rank);
  for (std::size_t k = 0; k < blocks.count; ++k) {
    if (k > 0) {
      for (Walk& walk : walks) walk.advance(k);
    }
    if (blocks.present[k] == 0) continue;
    double e[kColumns];
    const double n = static_cast<double>(k * blocks.length);
    for (std::size_t mode = 0; mode < shapes.size(); ++mode) {
      const DampedPair u = walks[mode].now();
      double* column = e + mode * PerMode;
      column[0] = u.c;
      column[1] = u.s;
      if constexpr (PerMode == 5) {
        column[2] = n * u.c;
        column[3] = n * u.s;
        column[4] = damped_sine_slope(shapes[mode], n, u);
      }
    }
    e[kColumns - 1] = 1;
    for (std::size_t i = 0; i < kColumns; ++i) {
      for (std::size_t j = 0; j <= i; ++j) gram[i][j] += e[i] * e[j];
    }
    const double* value = blocks.values.data() + k * rank;
    for (std::size_t r = 0; r < rank; ++r) {
      for (std::size_t i = 0; i < kColumns; ++i) data[r][i] += value[r] * e[i];
    }
  }
  Products<Modes * PerMode + 1> result;
  for (std::size_t i = 0; i < kColumns; ++i) {
    const auto row = static_cast<Eigen::Index>(i);
    for (std::size_t j = 0; j <= i; ++j) {
      const auto column = static_cast<Eigen::Index>(j);
      result.gram(row, column) = result.gram(column, row) = gram[i][j];
    }
    for (std::size_t r = 0; r < 3; ++r) result.data(row, static_cast<Eigen::Index>(r)) = data[r][i];
  }
  return result;
}

// Rows: how one white value depends on the columns, for each parameter's derivative.
template <int Modes, int PerMode>
struct Design {
  static constexpr int kColumns = Modes * PerMode + 1;
  Eigen::Matrix<double, 2 * Modes + 1, kColumns> linear = Eigen::Matrix<double, 2 * Modes + 1, kColumns>::Zero();
};

template <int Modes, int PerMode>
Design<Modes, PerMode> linear_design(const Responses<Modes>& responses, const Shapes<Modes>& shapes, double offset,
                                     std::size_t r) {
  Design<Modes, PerMode> design;
  for (std::size_t mode = 0; mode < shapes.size(); ++mode) {
    const Step& w = responses[mode].of[r];
    const auto at = static_cast<Eigen::Index>(mode * PerMode);
    const auto row = static_cast<Eigen::Index>(2 * mode);
    design.linear(row, at) = w.alpha.a;
    design.linear(row, at + 1) = -shapes[mode].q * w.beta.a;
    design.linear(row + 1, at) = w.beta.a;
    design.linear(row + 1, at + 1) = w.alpha.a;
  }
  design.linear(2 * Modes, Design<Modes, PerMode>::kColumns - 1) = offset;
  return design;
}

template <int Modes>
Responses<Modes> responses_of(const WhiteBlocks& blocks, const Shapes<Modes>& shapes) {
  Responses<Modes> result;
  for (std::size_t mode = 0; mode < shapes.size(); ++mode) result[mode] = response(blocks, shapes[mode]);
  return result;
}

template <int Modes, int PerMode>
Equations<Modes> equations_with(const WhiteBlocks& blocks, const Shapes<Modes>& shapes) {
  constexpr int kLinear = Equations<Modes>::kLinear;
  constexpr int kAll = Equations<Modes>::kAll;
  constexpr int kColumns = Modes * PerMode + 1;
  Equations<Modes> result;
  const auto products = accumulate<Modes, PerMode>(blocks, shapes);
  const auto responses = responses_of<Modes>(blocks, shapes);
  const double tail = static_cast<double>(blocks.tail_count);

  // The best linear parameters for these shapes.
  std::array<Design<Modes, PerMode>, 3> designs;
  Eigen::Matrix<double, kLinear, kLinear> normal = Eigen::Matrix<double, kLinear, kLinear>::Zero();
  Eigen::Matrix<double, kLinear, 1> right = Eigen::Matrix<double, kLinear, 1>::Zero();
  for (std::size_t r = 0; r < static_cast<std::size_t>(blocks.rank); ++r) {
    designs[r] =
        linear_design<Modes, PerMode>(responses, shapes, blocks.offset_response[static_cast<Eigen::Index>(r)], r);
    normal += designs[r].linear * products.gram * designs[r].linear.transpose();
    right += designs[r].linear * products.data.col(static_cast<Eigen::Index>(r));
  }
  normal(kLinear - 1, kLinear - 1) += tail;
  right[kLinear - 1] += blocks.tail_sum;
  const double yy = blocks.energy + (tail > 0 ? blocks.tail_sum * blocks.tail_sum / tail : 0);
  result.offset_only = yy - right[kLinear - 1] * right[kLinear - 1] / normal(kLinear - 1, kLinear - 1);
  const Eigen::Matrix<double, kLinear, 1> scale = normal.diagonal().cwiseSqrt();
  if (!(scale.array() > 0).all() || !scale.allFinite()) return result;
  const Eigen::Matrix<double, kLinear, kLinear> scaled =
      scale.cwiseInverse().asDiagonal() * normal * scale.cwiseInverse().asDiagonal();
  const Eigen::LDLT<Eigen::Matrix<double, kLinear, kLinear>> solver(scaled);
  if (solver.info() != Eigen::Success || solver.vectorD().minCoeff() < 1e-14) return result;
  result.linear = solver.solve(right.cwiseQuotient(scale)).cwiseQuotient(scale);
  if (!result.linear.allFinite()) return result;

  // chi-square as a sum of squares per value would need another walk; the difference is exact enough (1e-16 of energy).
  double energy = tail * result.linear[kLinear - 1] * result.linear[kLinear - 1];
  double cross = blocks.tail_sum * result.linear[kLinear - 1];
  std::array<Eigen::Matrix<double, kColumns, 1>, 3> model;
  for (std::size_t r = 0; r < static_cast<std::size_t>(blocks.rank); ++r) {
    model[r] = designs[r].linear.transpose() * result.linear;
    energy += model[r].dot(products.gram * model[r]);
    cross += model[r].dot(products.data.col(static_cast<Eigen::Index>(r)));
  }
  result.model_energy = energy;
  result.chi_square = std::max(0.0, yy - 2 * cross + energy);
  result.solvable = true;
  if constexpr (PerMode == 5) {
    result.normal.setZero();
    result.gradient.setZero();
    for (std::size_t r = 0; r < static_cast<std::size_t>(blocks.rank); ++r) {
      Eigen::Matrix<double, kAll, kColumns> rows = Eigen::Matrix<double, kAll, kColumns>::Zero();
      for (std::size_t mode = 0; mode < shapes.size(); ++mode) {
        const Step& w = responses[mode].of[r];
        const auto row = static_cast<Eigen::Index>(4 * mode), at = static_cast<Eigen::Index>(5 * mode);
        const double q = shapes[mode].q;
        const double p = result.linear[static_cast<Eigen::Index>(2 * mode)];
        const double s = result.linear[static_cast<Eigen::Index>(2 * mode + 1)];
        // f_p = alpha C - q beta S, f_s = alpha S + beta C; d/da C = -n C, d/dq C = -n S / 2.
        rows(row, at) = p * w.alpha.v[0] + s * w.beta.v[0];
        rows(row, at + 1) = -p * q * w.beta.v[0] + s * w.alpha.v[0];
        rows(row, at + 2) = -(p * w.alpha.a + s * w.beta.a);
        rows(row, at + 3) = -(-p * q * w.beta.a + s * w.alpha.a);
        rows(row + 1, at) = p * w.alpha.v[1] + s * w.beta.v[1];
        rows(row + 1, at + 1) = -p * (w.beta.a + q * w.beta.v[1]) + s * w.alpha.v[1];
        rows(row + 1, at + 3) = -(p * w.alpha.a + s * w.beta.a) / 2;
        rows(row + 1, at + 4) = -p * q * w.beta.a + s * w.alpha.a;
        rows.row(row + 2) = designs[r].linear.row(static_cast<Eigen::Index>(2 * mode));
        rows.row(row + 3) = designs[r].linear.row(static_cast<Eigen::Index>(2 * mode + 1));
      }
      rows.row(kAll - 1) = designs[r].linear.row(kLinear - 1);
      result.normal += rows * products.gram * rows.transpose();
      result.gradient += rows * (products.data.col(static_cast<Eigen::Index>(r)) - products.gram * model[r]);
    }
    result.normal(kAll - 1, kAll - 1) += tail;
    result.gradient[kAll - 1] += blocks.tail_sum - tail * result.linear[kLinear - 1];
  }
  return result;
}

}  // namespace

double Shape::slow_decay() const {
  return q < 0 ? a - std::sqrt(-q) : a;
}
double Shape::fast_decay() const {
  return q < 0 ? a + std::sqrt(-q) : a;
}
double Shape::omega() const {
  return q > 0 ? std::sqrt(q) : 0;
}

DampedPair damped_pair(const Shape& shape, double n) {
  const double x = shape.q * n * n;
  if (std::abs(x) < 0.01) {
    const double e = std::exp(-shape.a * n);
    return {e * (1 - x / 2 * (1 - x / 12 * (1 - x / 30 * (1 - x / 56)))),
            e * n * (1 - x / 6 * (1 - x / 20 * (1 - x / 42 * (1 - x / 72))))};
  }
  if (x > 0) {
    // The phase in extended precision: after 10^7 samples a double would be off by 10^-9 rad.
    constexpr long double kTurn = 2 * std::numbers::pi_v<long double>;
    const long double w = std::sqrt(static_cast<long double>(shape.q));
    const long double phase = w * static_cast<long double>(n);
    const auto turned = static_cast<double>(phase - kTurn * std::floor(phase / kTurn));
    const double e = std::exp(-shape.a * n);
    return {e * std::cos(turned), e * std::sin(turned) / static_cast<double>(w)};
  }
  // Both exponents apart: cosh alone would overflow where the damped product is harmless.
  const double r = std::sqrt(-shape.q);
  const double slow = std::exp(-(shape.a - r) * n), fast = std::exp(-(shape.a + r) * n);
  return {(slow + fast) / 2, (slow - fast) / (2 * r)};
}

double damped_sine_slope(const Shape& shape, double n, const DampedPair& at) {
  const double x = shape.q * n * n;
  if (std::abs(x) < 0.5) {
    // S = n (1 - x/3! + x^2/5! - ...), derivative term by term; the last one kept is below 1e-16 of the first here.
    const double series = 1 - x / 10 * (1 - x / 28 * (1 - x / 54 * (1 - x / 88 * (1 - x / 130 * (1 - x / 180)))));
    return -std::exp(-shape.a * n) * n * n * n / 6 * series;
  }
  return (n * at.c - at.s) / (2 * shape.q);
}

template <int Modes>
Equations<Modes> equations(const WhiteBlocks& blocks, const Shapes<Modes>& shapes, bool derivatives) {
  return derivatives ? equations_with<Modes, 5>(blocks, shapes) : equations_with<Modes, 2>(blocks, shapes);
}
template Equations<1> equations<1>(const WhiteBlocks&, const Shapes<1>&, bool);
template Equations<2> equations<2>(const WhiteBlocks&, const Shapes<2>&, bool);

template <int Modes>
double model_square(const WhiteBlocks& blocks, const Shapes<Modes>& shapes, const Linear<Modes>& linear) {
  // State of all modes and the constant; the model is linear.state and its square over a block a quadratic form.
  using Square = Eigen::Matrix<double, 2 * Modes + 1, 2 * Modes + 1>;
  Square one = Square::Identity();
  for (std::size_t mode = 0; mode < shapes.size(); ++mode) {
    const DampedPair at = damped_pair(shapes[mode], 1);
    const auto i = static_cast<Eigen::Index>(2 * mode);
    one(i, i) = one(i + 1, i + 1) = at.c;
    one(i, i + 1) = -shapes[mode].q * at.s;
    one(i + 1, i) = at.s;
  }
  const Square single = linear * linear.transpose();
  Square form = single, power = one;
  int bit = 63;
  while (((blocks.length >> bit) & 1U) == 0) --bit;
  for (--bit; bit >= 0; --bit) {
    form += (power.transpose() * form * power).eval();
    power = (power * power).eval();
    if (((blocks.length >> bit) & 1U) != 0) {
      form += (power.transpose() * single * power).eval();
      power = (power * one).eval();
    }
  }
  const auto states = accumulate<Modes, 2>(blocks, shapes);
  const double c = linear[2 * Modes];
  return form.cwiseProduct(states.gram).sum() + c * c * static_cast<double>(blocks.tail_count);
}
template double model_square<1>(const WhiteBlocks&, const Shapes<1>&, const Linear<1>&);
template double model_square<2>(const WhiteBlocks&, const Shapes<2>&, const Linear<2>&);

template <int Modes>
std::vector<double> white_residuals(const WhiteBlocks& blocks, const Shapes<Modes>& shapes,
                                    const Linear<Modes>& linear) {
  const auto responses = responses_of<Modes>(blocks, shapes);
  const std::size_t rank = static_cast<std::size_t>(blocks.rank);
  std::vector<double> residuals(blocks.count * rank);
  for (std::size_t k = 0; k < blocks.count; ++k) {
    if (blocks.present[k] == 0) continue;
    for (std::size_t r = 0; r < rank; ++r) {
      residuals[k * rank + r] =
          blocks.values[k * rank + r] - linear[2 * Modes] * blocks.offset_response[static_cast<Eigen::Index>(r)];
    }
  }
  for (std::size_t mode = 0; mode < shapes.size(); ++mode) {
    Walk walk(shapes[mode], blocks.length);
    const double p = linear[static_cast<Eigen::Index>(2 * mode)], s = linear[static_cast<Eigen::Index>(2 * mode + 1)];
    for (std::size_t k = 0; k < blocks.count; ++k) {
      if (k > 0) walk.advance(k);
      if (blocks.present[k] == 0) continue;
      const DampedPair u = walk.now();
      for (std::size_t r = 0; r < rank; ++r) {
        const Step& w = responses[mode].of[r];
        residuals[k * rank + r] -=
            p * (w.alpha.a * u.c - shapes[mode].q * w.beta.a * u.s) + s * (w.alpha.a * u.s + w.beta.a * u.c);
      }
    }
  }
  return residuals;
}
template std::vector<double> white_residuals<1>(const WhiteBlocks&, const Shapes<1>&, const Linear<1>&);
template std::vector<double> white_residuals<2>(const WhiteBlocks&, const Shapes<2>&, const Linear<2>&);

}  // namespace coilassay

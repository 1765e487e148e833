#include "fitting/sine_blocks.h"

#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <numbers>

namespace coilassay {
namespace {

using Complex = std::complex<double>;

/// Real and imaginary part of a local amplitude to the whitened values of a block, and the derivative by omega.
struct Response {
  Eigen::Matrix<double, 3, 2> value, slope;
};

Response response_of(const WhiteBlocks& blocks, double omega) {
  const TurningSum near = turning_sum(omega - blocks.omega, blocks.length);
  const TurningSum far = turning_sum(omega + blocks.omega, blocks.length);
  const TurningSum plain = turning_sum(omega, blocks.length);
  // S y e^{-j w0 m} = (a s_near + conj(a s_far))/2, S y = Re(a s_plain) for y = Re(a e^{j w m}).
  const auto parts = [](const Complex& n, const Complex& f, const Complex& p) {
    Eigen::Matrix<double, 3, 2> m;
    m << (n.real() + f.real()) / 2, -(n.imag() + f.imag()) / 2,  //
        (n.imag() - f.imag()) / 2, (n.real() - f.real()) / 2,    //
        p.real(), -p.imag();
    return m;
  };
  return {blocks.whitening * parts(near.value, far.value, plain.value),
          blocks.whitening * parts(near.slope, far.slope, plain.slope)};
}

/// e^{j omega (k length - centre)}, k = 0, 1, ...: by recurrence, reseeded.
class BlockPhase {
 public:
  BlockPhase(const WhiteBlocks& blocks, double omega, double centre)
      : step_(omega * static_cast<double>(blocks.length)), start_(-omega * centre), turn_(std::polar(1.0, step_)) {}
  Complex next() {
    now_ = count_ % 64 == 0 ? std::polar(1.0, start_ + step_ * static_cast<double>(count_)) : now_ * turn_;
    ++count_;
    return now_;
  }

 private:
  double step_, start_;
  Complex turn_, now_;
  std::size_t count_ = 0;
};

}  // namespace

TurningSum turning_sum(double theta, std::size_t length) {
  theta = std::remainder(theta, 2 * std::numbers::pi);
  const double n = static_cast<double>(length);
  // Dirichlet's kernel and its derivative; near theta = 0 by their series.
  double kernel, kernel_slope;
  if (std::fabs(theta) * n < 1e-3) {
    kernel = n * (1 - theta * theta * (n * n - 1) / 24);
    kernel_slope = -n * theta * (n * n - 1) / 12;
  } else {
    const double half = std::sin(theta / 2);
    kernel = std::sin(n * theta / 2) / half;
    kernel_slope = (n * std::cos(n * theta / 2) - kernel * std::cos(theta / 2)) / (2 * half);
  }
  const Complex turned = std::polar(1.0, theta * (n - 1) / 2);
  return {turned * kernel, turned * Complex(kernel_slope, kernel * (n - 1) / 2)};
}

double SineSolution::sine_energy() const {
  const Eigen::Vector2d sine = linear.head<2>();
  const double with_offset = normal.block<1, 2>(2, 0).dot(sine);
  return sine.dot(normal.topLeftCorner<2, 2>() * sine) - with_offset * with_offset / normal(2, 2);
}

double SineSolution::own_slope_square() const {
  return slope_square - cross.dot(normal.ldlt().solve(cross));
}

SineSolution solve_sine(const WhiteBlocks& blocks, double omega, double centre, bool with_slope) {
  SineSolution s;
  const Response response = response_of(blocks, omega);
  const int rank = blocks.rank;
  const auto& m = response.value;

  Eigen::Vector3d right = Eigen::Vector3d::Zero();
  double nrr = 0, nri = 0, nii = 0, nro = 0, nio = 0;
  std::size_t used = 0;
  BlockPhase phase(blocks, omega, centre);
  const double* v = blocks.values.data();
  for (std::size_t k = 0; k < blocks.count; ++k, v += rank) {
    const Complex p = phase.next();
    if (blocks.present[k] == 0) continue;
    ++used;
    for (int r = 0; r < rank; ++r) {
      const double re = m(r, 0) * p.real() + m(r, 1) * p.imag();
      const double im = m(r, 1) * p.real() - m(r, 0) * p.imag();
      nrr += re * re;
      nri += re * im;
      nii += im * im;
      nro += re * blocks.offset_response[r];
      nio += im * blocks.offset_response[r];
      right[0] += re * v[r];
      right[1] += im * v[r];
      right[2] += blocks.offset_response[r] * v[r];
    }
  }
  const double noo = blocks.offset_response.head(rank).squaredNorm() * static_cast<double>(used);
  s.normal << nrr, nri, nro, nri, nii, nio, nro, nio, noo;
  const Eigen::LDLT<Eigen::Matrix3d> ldlt(s.normal);
  s.solvable = used >= 2 && ldlt.isPositive() && ldlt.vectorD().minCoeff() > 1e-12 * noo;
  if (!s.solvable) return s;
  s.linear = ldlt.solve(right);
  s.chi_square = std::max(0.0, blocks.energy - right.dot(s.linear));
  if (!with_slope) return s;

  const double a = s.linear[0], b = s.linear[1], c = s.linear[2];
  const double length = static_cast<double>(blocks.length);
  double chi = 0;
  BlockPhase again(blocks, omega, centre);
  v = blocks.values.data();
  for (std::size_t k = 0; k < blocks.count; ++k, v += rank) {
    const Complex p = again.next();
    if (blocks.present[k] == 0) continue;
    const double t = static_cast<double>(k) * length - centre;
    const double lr = a * p.real() - b * p.imag(), li = a * p.imag() + b * p.real();  // local amplitude
    for (int r = 0; r < rank; ++r) {
      const double re = m(r, 0) * p.real() + m(r, 1) * p.imag();
      const double im = m(r, 1) * p.real() - m(r, 0) * p.imag();
      const double o = blocks.offset_response[r];
      const double left = v[r] - (a * re + b * im + c * o);
      const double slope =
          t * (m(r, 1) * lr - m(r, 0) * li) + response.slope(r, 0) * lr + response.slope(r, 1) * li;
      s.slope_square += slope * slope;
      s.slope_residual += slope * left;
      s.cross[0] += slope * re;
      s.cross[1] += slope * im;
      s.cross[2] += slope * o;
      chi += left * left;
    }
  }
  s.chi_square = chi;
  return s;
}

void subtract_sine(WhiteBlocks& blocks, double omega, double centre, Complex amplitude) {
  const Response response = response_of(blocks, omega);
  BlockPhase phase(blocks, omega, centre);
  double* v = blocks.values.data();
  double energy = 0;
  for (std::size_t k = 0; k < blocks.count; ++k, v += blocks.rank) {
    const Complex local = amplitude * phase.next();
    if (blocks.present[k] == 0) continue;
    for (int r = 0; r < blocks.rank; ++r) {
      v[r] -= response.value(r, 0) * local.real() + response.value(r, 1) * local.imag();
      energy += v[r] * v[r];
    }
  }
  blocks.energy = energy;
}

double refined_omega(const WhiteBlocks& blocks) {
  // Whitened values back to demodulated sums: the rows of the whitening are orthogonal.
  std::vector<Complex> sums(blocks.count);
  Eigen::Matrix<double, 2, 3> back = Eigen::Matrix<double, 2, 3>::Zero();
  for (int r = 0; r < blocks.rank; ++r) {
    const double share = blocks.whitening.row(r).squaredNorm();
    back(0, r) = blocks.whitening(r, 0) / share;
    back(1, r) = blocks.whitening(r, 1) / share;
  }
  const double* v = blocks.values.data();
  for (std::size_t k = 0; k < blocks.count; ++k, v += blocks.rank) {
    if (blocks.present[k] == 0) continue;
    for (int r = 0; r < blocks.rank; ++r) sums[k] += Complex(back(0, r), back(1, r)) * v[r];
  }
  // Phase from block to block, then from pair to pair with what is known taken out: twice as sharp at every level. Blocks
  // hold any number of periods: the phase of block k turns by omega0 length k beside what is looked for.
  double turn = 0;  // per block of the first level
  double span = 1;  // blocks of the first level in one of this
  const double carrier = std::remainder(blocks.omega * static_cast<double>(blocks.length), 2 * std::numbers::pi);
  for (std::size_t k = 0; k < sums.size(); ++k) {
    sums[k] *= std::polar(1.0, -std::remainder(carrier * static_cast<double>(k), 2 * std::numbers::pi));
  }
  while (sums.size() >= 4) {
    Complex lag = 0;
    for (std::size_t k = 0; k + 1 < sums.size(); ++k) lag += std::conj(sums[k]) * sums[k + 1];
    const double step = std::arg(lag);  // per block of this level
    turn += step / span;
    std::vector<Complex> pairs(sums.size() / 2);
    for (std::size_t k = 0; k < sums.size(); ++k) sums[k] *= std::polar(1.0, -step * static_cast<double>(k));
    for (std::size_t k = 0; k < pairs.size(); ++k) pairs[k] = sums[2 * k] + sums[2 * k + 1];
    sums = std::move(pairs);
    span *= 2;
  }
  return blocks.omega + turn / static_cast<double>(blocks.length);
}

}  // namespace coilassay

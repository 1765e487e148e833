#include "fitting/white_blocks.h"

#include <Eigen/Eigenvalues>
#include <cassert>
#include <cmath>
#include <complex>

#include "fitting/blocks.h"

namespace coilassay {
namespace {

// Directions whose share of the block's information is below this are rounding, not data.
constexpr double kLeastShare = 1e-9;

std::complex<double> phase_sum(double omega, std::size_t length) {
  // sum of e^{-i omega m}, m < length; the closed form is safe because omega is at least a few cycles per record.
  const std::complex<double> i(0, 1);
  const double n = static_cast<double>(length);
  const double half = std::sin(omega / 2);
  if (std::abs(half) < 1e-12) return n;
  return std::sin(omega * n / 2) / half * std::polar(1.0, -omega * (n - 1) / 2);
}

// Eigenvectors of the Gram matrix of {cos, -sin, 1} over a block, each divided by the root of its eigenvalue.
// `step` samples share one phase.
int whiten(double omega, std::size_t length, std::size_t step, Eigen::Matrix3d& whitening,
           Eigen::Vector3d& offset_response) {
  const double n = static_cast<double>(length);
  whitening.setZero();
  offset_response.setZero();
  if (omega == 0) {
    whitening(0, 2) = 1 / std::sqrt(n);
    offset_response[0] = std::sqrt(n);
    return 1;
  }
  const double each = static_cast<double>(step);
  const std::complex<double> once = each * phase_sum(omega * each, length / step);
  const std::complex<double> twice = each * phase_sum(2 * omega * each, length / step);
  Eigen::Matrix3d gram;
  gram << (n + twice.real()) / 2, twice.imag() / 2, once.real(),  //
      twice.imag() / 2, (n - twice.real()) / 2, once.imag(),      //
      once.real(), once.imag(), n;
  const Eigen::SelfAdjointEigenSolver<Eigen::Matrix3d> solver(gram);
  int rank = 0;
  for (int i = 2; i >= 0; --i) {
    const double share = solver.eigenvalues()[i];
    if (share < kLeastShare * solver.eigenvalues()[2]) break;
    whitening.row(rank++) = solver.eigenvectors().col(i).transpose() / std::sqrt(share);
  }
  offset_response = whitening * Eigen::Vector3d(once.real(), once.imag(), n);
  return rank;
}

WhiteBlocks whitened(std::span<const double> y, const BlockSums& sums, std::size_t step) {
  WhiteBlocks blocks;
  blocks.length = sums.length;
  blocks.count = sums.sum.size();
  blocks.omega = sums.omega;
  blocks.step = step;
  blocks.reference = sums.reference;
  blocks.rank = whiten(blocks.omega, blocks.length, step, blocks.whitening, blocks.offset_response);
  const std::size_t rank = static_cast<std::size_t>(blocks.rank);
  blocks.values.resize(blocks.count * rank);
  blocks.present.resize(blocks.count);
  for (std::size_t k = 0; k < blocks.count; ++k) {
    if (!std::isfinite(sums.sum[k])) {
      blocks.lost += present_sum(y.subspan(k * blocks.length, blocks.length), blocks.reference).count;
      continue;
    }
    blocks.present[k] = 1;
    ++blocks.present_blocks;
    blocks.square += sums.square[k];
    const std::complex<double> turned = blocks.omega != 0 ? sums.demodulated[k] : 0;
    for (std::size_t r = 0; r < rank; ++r) {
      const auto row = static_cast<Eigen::Index>(r);
      const double value = blocks.whitening(row, 0) * turned.real() + blocks.whitening(row, 1) * turned.imag() +
                           blocks.whitening(row, 2) * sums.sum[k];
      blocks.values[k * rank + r] = value;
      blocks.energy += value * value;
    }
  }
  return blocks;
}

void take_tail(std::span<const double> y, std::size_t from, WhiteBlocks& blocks) {
  if (from >= y.size()) return;
  const PresentSum tail = present_sum(y.subspan(from), blocks.reference);
  blocks.tail_sum = tail.sum;
  blocks.tail_square = tail.square;
  blocks.tail_count = tail.count;
}

}  // namespace

WhiteBlocks white_blocks(std::span<const double> y, std::size_t length, std::size_t count, double omega,
                         double reference, std::size_t tail_from) {
  assert(length * count <= tail_from);
  WhiteBlocks blocks = whitened(y, block_sums(y, length, count, omega, reference), 1);
  take_tail(y, tail_from, blocks);
  return blocks;
}

WhiteBlocks white_blocks(std::span<const double> y, const ShortSums& sums, std::size_t length, std::size_t count,
                         double omega, std::size_t tail_from) {
  assert(length * count <= tail_from);
  WhiteBlocks blocks = whitened(y, block_sums(sums, length, count, omega), sums.length);
  take_tail(y, tail_from, blocks);
  return blocks;
}

}  // namespace coilassay

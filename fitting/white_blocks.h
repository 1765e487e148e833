// Block sums as independent numbers of equal weight. Internal to this room.
#pragma once

#include <Eigen/Core>
#include <cstddef>
#include <span>
#include <vector>

#include "fitting/short_sums.h"

namespace coilassay {

/// Block sums made white: noise of variance sigma^2 per sample becomes noise of variance sigma^2 per value.
///
/// Demodulated sums of one block are correlated (their covariance is sigma^2 times the Gram matrix of cos, -sin and 1
/// over the block); the Gram matrix is diagonalised once and directions without information are dropped, so that blocks
/// shorter than a period are as good as any. Rank 1 for plain sums, at most 3 for demodulated ones.
struct WhiteBlocks {
  std::size_t length = 1;
  std::size_t count = 0;
  int rank = 1;
  double omega = 0;
  std::size_t step = 1;                // samples that share one phase (more than 1: made from short sums)
  double reference = 0;                // was subtracted from every sample
  Eigen::Matrix3d whitening;           // rank rows; columns act on Re, Im, sum (plain sums: the last column only)
  Eigen::Vector3d offset_response;     // what a constant 1 gives
  std::vector<double> values;          // count x rank
  std::vector<unsigned char> present;  // 0: the block holds a missing sample and is left out
  std::size_t present_blocks = 0;
  std::size_t lost = 0;  // samples that are present but share a block with a missing one
  double energy = 0;     // sum of values^2 over present blocks
  double square = 0;     // sum of (sample - reference)^2 over present blocks
  // Samples after the blocks, where nothing but the offset is left.
  double tail_sum = 0, tail_square = 0;
  std::size_t tail_count = 0;

  std::size_t samples() const { return present_blocks * length + tail_count; }
  std::size_t values_used() const { return present_blocks * static_cast<std::size_t>(rank) + (tail_count > 0 ? 1 : 0); }
};

/// Blocks of `length` over y[0, length * count), the samples from `tail_from` on as the tail (y.size(): none).
WhiteBlocks white_blocks(std::span<const double> y, std::size_t length, std::size_t count, double omega,
                         double reference, std::size_t tail_from);

/// The same from short sums that cover the samples of y; length a multiple of theirs.
WhiteBlocks white_blocks(std::span<const double> y, const ShortSums& sums, std::size_t length, std::size_t count,
                         double omega, std::size_t tail_from);

}  // namespace coilassay

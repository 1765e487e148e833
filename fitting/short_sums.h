// Sums over short blocks, from which sums over longer ones are made without reading the samples again. Internal.
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "fitting/blocks.h"

namespace coilassay {

/// Sums of (y - reference) and of its square over consecutive blocks of `length` samples from the first on.
struct ShortSums {
  std::size_t length = 0;  // 0: none
  double reference = 0;
  std::vector<double> sum, square;

  /// Reads what is left of y; false when a sample is missing, and then the sums are of no use.
  bool complete(std::span<const double> y);
};

/// block_sums of the samples, from the short sums: `length` a multiple of theirs. Demodulated with the phase of the
/// first sample of each short block, S_j e^{-i omega j L}: the sums of a damped sine over short blocks are a damped
/// sine, and what is lost of it is (omega L)^2 / 12.
BlockSums block_sums(const ShortSums& sums, std::size_t length, std::size_t count, double omega);

}  // namespace coilassay

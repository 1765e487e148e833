// The inner loops of block_sums, one implementation per instruction set. Internal to this room.
#pragma once

#include <cstddef>

namespace coilassay::kernel {

/// Eight interleaved partial sums (lane = m mod 8) per quantity. Both implementations add the same numbers in the same
/// order, without fused multiply-add, so that a result never depends on the processor.
struct Lanes {
  alignas(32) double sum[8];
  alignas(32) double square[8];
  alignas(32) double re[8];
  alignas(32) double im[8];
};

using PlainKernel = void (*)(const double* v, std::size_t groups, double reference, Lanes& lanes);
using DemodulatingKernel = void (*)(const double* v, const double* cosine, const double* minus_sine, std::size_t groups,
                                    double reference, Lanes& lanes);

// `groups` groups of eight samples; no alignment of v is assumed. The lanes are set (re and im by the demodulating ones
// only), not added to: clearing them first would cost as much as a short block.
void plain_sse2(const double* v, std::size_t groups, double reference, Lanes& lanes);
void plain_avx2(const double* v, std::size_t groups, double reference, Lanes& lanes);
void demodulating_sse2(const double* v, const double* cosine, const double* minus_sine, std::size_t groups,
                       double reference, Lanes& lanes);
void demodulating_avx2(const double* v, const double* cosine, const double* minus_sine, std::size_t groups,
                       double reference, Lanes& lanes);

}  // namespace coilassay::kernel

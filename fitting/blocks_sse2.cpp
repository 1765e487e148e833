// Baseline x86-64: two doubles a register. Half of the eight lanes at a time, or the accumulators would not fit into
// sixteen registers; the second half reads the samples again from the first-level cache.
#include <emmintrin.h>

#include "fitting/blocks_kernel.h"

namespace coilassay::kernel {

void plain_sse2(const double* v, std::size_t groups, double reference, Lanes& lanes) {
  const __m128d r = _mm_set1_pd(reference);
  __m128d sum[4], square[4];
  for (int j = 0; j < 4; ++j) {
    sum[j] = _mm_setzero_pd();
    square[j] = _mm_setzero_pd();
  }
  for (std::size_t g = 0; g < groups; ++g, v += 8) {
    for (int j = 0; j < 4; ++j) {
      const __m128d x = _mm_sub_pd(_mm_loadu_pd(v + 2 * j), r);
      sum[j] = _mm_add_pd(sum[j], x);
      square[j] = _mm_add_pd(square[j], _mm_mul_pd(x, x));
    }
  }
  for (int j = 0; j < 4; ++j) {
    _mm_store_pd(lanes.sum + 2 * j, sum[j]);
    _mm_store_pd(lanes.square + 2 * j, square[j]);
  }
}

namespace {

void demodulate_half(const double* v, const double* cosine, const double* minus_sine, std::size_t groups,
                     double reference, Lanes& lanes, int first) {
  const __m128d r = _mm_set1_pd(reference);
  __m128d sum[2], square[2], re[2], im[2];
  for (int j = 0; j < 2; ++j) {
    sum[j] = _mm_setzero_pd();
    square[j] = _mm_setzero_pd();
    re[j] = _mm_setzero_pd();
    im[j] = _mm_setzero_pd();
  }
  for (std::size_t g = 0; g < groups; ++g) {
    const std::size_t at = 8 * g + static_cast<std::size_t>(first);
    for (std::size_t j = 0; j < 2; ++j) {
      const __m128d x = _mm_sub_pd(_mm_loadu_pd(v + at + 2 * j), r);
      sum[j] = _mm_add_pd(sum[j], x);
      square[j] = _mm_add_pd(square[j], _mm_mul_pd(x, x));
      re[j] = _mm_add_pd(re[j], _mm_mul_pd(x, _mm_loadu_pd(cosine + at + 2 * j)));
      im[j] = _mm_add_pd(im[j], _mm_mul_pd(x, _mm_loadu_pd(minus_sine + at + 2 * j)));
    }
  }
  for (int j = 0; j < 2; ++j) {
    const int lane = first + 2 * j;
    _mm_store_pd(lanes.sum + lane, sum[j]);
    _mm_store_pd(lanes.square + lane, square[j]);
    _mm_store_pd(lanes.re + lane, re[j]);
    _mm_store_pd(lanes.im + lane, im[j]);
  }
}

}  // namespace

void demodulating_sse2(const double* v, const double* cosine, const double* minus_sine, std::size_t groups,
                       double reference, Lanes& lanes) {
  demodulate_half(v, cosine, minus_sine, groups, reference, lanes, 0);
  demodulate_half(v, cosine, minus_sine, groups, reference, lanes, 4);
}

}  // namespace coilassay::kernel

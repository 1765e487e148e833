// Four doubles a register; this file alone is compiled for AVX2 and entered only where the processor has it.
#include <immintrin.h>

#include "fitting/blocks_kernel.h"

namespace coilassay::kernel {

void plain_avx2(const double* v, std::size_t groups, double reference, Lanes& lanes) {
  const __m256d r = _mm256_set1_pd(reference);
  __m256d sum0 = _mm256_setzero_pd(), sum1 = _mm256_setzero_pd();
  __m256d square0 = _mm256_setzero_pd(), square1 = _mm256_setzero_pd();
  for (std::size_t g = 0; g < groups; ++g, v += 8) {
    const __m256d x0 = _mm256_sub_pd(_mm256_loadu_pd(v), r);
    const __m256d x1 = _mm256_sub_pd(_mm256_loadu_pd(v + 4), r);
    sum0 = _mm256_add_pd(sum0, x0);
    sum1 = _mm256_add_pd(sum1, x1);
    square0 = _mm256_add_pd(square0, _mm256_mul_pd(x0, x0));
    square1 = _mm256_add_pd(square1, _mm256_mul_pd(x1, x1));
  }
  _mm256_store_pd(lanes.sum, sum0);
  _mm256_store_pd(lanes.sum + 4, sum1);
  _mm256_store_pd(lanes.square, square0);
  _mm256_store_pd(lanes.square + 4, square1);
}

void demodulating_avx2(const double* v, const double* cosine, const double* minus_sine, std::size_t groups,
                       double reference, Lanes& lanes) {
  const __m256d r = _mm256_set1_pd(reference);
  __m256d sum0 = _mm256_setzero_pd(), sum1 = _mm256_setzero_pd();
  __m256d square0 = _mm256_setzero_pd(), square1 = _mm256_setzero_pd();
  __m256d re0 = _mm256_setzero_pd(), re1 = _mm256_setzero_pd();
  __m256d im0 = _mm256_setzero_pd(), im1 = _mm256_setzero_pd();
  for (std::size_t g = 0; g < groups; ++g, v += 8, cosine += 8, minus_sine += 8) {
    const __m256d x0 = _mm256_sub_pd(_mm256_loadu_pd(v), r);
    const __m256d x1 = _mm256_sub_pd(_mm256_loadu_pd(v + 4), r);
    sum0 = _mm256_add_pd(sum0, x0);
    sum1 = _mm256_add_pd(sum1, x1);
    square0 = _mm256_add_pd(square0, _mm256_mul_pd(x0, x0));
    square1 = _mm256_add_pd(square1, _mm256_mul_pd(x1, x1));
    re0 = _mm256_add_pd(re0, _mm256_mul_pd(x0, _mm256_loadu_pd(cosine)));
    re1 = _mm256_add_pd(re1, _mm256_mul_pd(x1, _mm256_loadu_pd(cosine + 4)));
    im0 = _mm256_add_pd(im0, _mm256_mul_pd(x0, _mm256_loadu_pd(minus_sine)));
    im1 = _mm256_add_pd(im1, _mm256_mul_pd(x1, _mm256_loadu_pd(minus_sine + 4)));
  }
  _mm256_store_pd(lanes.sum, sum0);
  _mm256_store_pd(lanes.sum + 4, sum1);
  _mm256_store_pd(lanes.square, square0);
  _mm256_store_pd(lanes.square + 4, square1);
  _mm256_store_pd(lanes.re, re0);
  _mm256_store_pd(lanes.re + 4, re1);
  _mm256_store_pd(lanes.im, im0);
  _mm256_store_pd(lanes.im + 4, im1);
}

}  // namespace coilassay::kernel

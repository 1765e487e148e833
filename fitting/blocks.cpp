#include "fitting/blocks.h"

#include <algorithm>
#include <cassert>
#include <cmath>

#include "fitting/blocks_kernel.h"

namespace coilassay {
namespace {

// One table of this many phases serves every block: with the samples it fits into the first-level cache.
constexpr std::size_t kTable = 512;

struct Kernels {
  kernel::PlainKernel plain;
  kernel::DemodulatingKernel demodulating;
};

const Kernels& kernels() {
  static const Kernels chosen = __builtin_cpu_supports("avx2") ? Kernels{kernel::plain_avx2, kernel::demodulating_avx2}
                                                               : Kernels{kernel::plain_sse2, kernel::demodulating_sse2};
  return chosen;
}

double total(const double (&lane)[8]) {
  return ((lane[0] + lane[4]) + (lane[2] + lane[6])) + ((lane[1] + lane[5]) + (lane[3] + lane[7]));
}

// Phases by recurrence, reseeded every 16 steps: library calls would cost more than the sums on short records.
struct PhaseTable {
  PhaseTable(double omega, std::size_t length) : cosine(length), minus_sine(length) {
    const double c1 = std::cos(omega), s1 = -std::sin(omega);
    for (std::size_t m = 0; m < length; ++m) {
      if (m % 16 == 0) {
        cosine[m] = std::cos(omega * static_cast<double>(m));
        minus_sine[m] = -std::sin(omega * static_cast<double>(m));
      } else {
        cosine[m] = cosine[m - 1] * c1 - minus_sine[m - 1] * s1;
        minus_sine[m] = cosine[m - 1] * s1 + minus_sine[m - 1] * c1;
      }
    }
  }
  std::vector<double> cosine, minus_sine;
};

}  // namespace

BlockSums block_sums(std::span<const double> y, std::size_t length, std::size_t count, double omega, double reference) {
  assert(length > 0 && length * count <= y.size());
  BlockSums sums{.length = length,
                 .omega = omega,
                 .reference = reference,
                 .sum = std::vector<double>(count),
                 .square = std::vector<double>(count),
                 .demodulated = {}};
  const bool demodulate = omega != 0;
  if (demodulate) sums.demodulated.resize(count);
  const PhaseTable table(omega, demodulate ? std::min(length, kTable) : 0);
  const Kernels& k = kernels();
  const double* v = y.data();
  if (!demodulate && length < 16) {
    // Too short for lanes to pay.
    for (std::size_t block = 0; block < count; ++block) {
      for (std::size_t m = 0; m < length; ++m) {
        const double x = v[m] - reference;
        sums.sum[block] += x;
        sums.square[block] += x * x;
      }
      v += length;
    }
    return sums;
  }
  for (std::size_t block = 0; block < count; ++block) {
    double sum = 0, square = 0;
    std::complex<double> rotated = 0;
    for (std::size_t from = 0; from < length; from += kTable) {
      const std::size_t n = std::min(kTable, length - from);
      const std::size_t groups = n / 8;
      kernel::Lanes lanes;
      if (demodulate) {
        k.demodulating(v, table.cosine.data(), table.minus_sine.data(), groups, reference, lanes);
      } else {
        k.plain(v, groups, reference, lanes);
      }
      for (std::size_t m = 8 * groups; m < n; ++m) {
        const std::size_t lane = m % 8;
        const double x = v[m] - reference;
        lanes.sum[lane] += x;
        lanes.square[lane] += x * x;
        if (demodulate) {
          lanes.re[lane] += x * table.cosine[m];
          lanes.im[lane] += x * table.minus_sine[m];
        }
      }
      sum += total(lanes.sum);
      square += total(lanes.square);
      if (demodulate) {
        const std::complex<double> part(total(lanes.re), total(lanes.im));
        rotated += from == 0 ? part : part * std::polar(1.0, -omega * static_cast<double>(from));
      }
      v += n;
    }
    sums.sum[block] = sum;
    sums.square[block] = square;
    if (demodulate) sums.demodulated[block] = rotated;
  }
  return sums;
}

PresentSum present_sum(std::span<const double> y, double reference) {
  // Whole chunks by the fast kernel; only a chunk that holds a NaN is looked at sample by sample.
  constexpr std::size_t kChunk = 4096;
  PresentSum all;
  for (std::size_t from = 0; from < y.size(); from += kChunk) {
    const std::span<const double> chunk = y.subspan(from, std::min(kChunk, y.size() - from));
    const BlockSums whole = block_sums(chunk, chunk.size(), 1, 0, reference);
    if (std::isfinite(whole.sum[0])) {
      all.sum += whole.sum[0];
      all.square += whole.square[0];
      all.count += chunk.size();
      continue;
    }
    for (const double v : chunk) {
      if (!std::isfinite(v)) continue;
      all.sum += v - reference;
      all.square += (v - reference) * (v - reference);
      ++all.count;
    }
  }
  return all;
}

}  // namespace coilassay

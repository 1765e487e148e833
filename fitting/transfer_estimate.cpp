#include "fitting/transfer_estimate.h"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <limits>
#include <numbers>

#include "fitting/spectrum.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;

std::vector<double> hann(std::size_t length) {
  // Symmetric about the middle, and the second quarter of the cosine is the first turned over.
  std::vector<double> window(length);
  const double step = 2 * std::numbers::pi / static_cast<double>(length);
  const std::size_t half = length / 2;
  for (std::size_t n = 0; n <= half / 2; ++n) {
    const double cosine = std::cos(step * static_cast<double>(n));
    window[n] = 0.5 - 0.5 * cosine;
    window[half - n] = 0.5 + 0.5 * cosine;
  }
  if (half % 2 != 0) window[half / 2 + 1] = 0.5 - 0.5 * std::cos(step * static_cast<double>(half / 2 + 1));
  for (std::size_t n = half + 1; n < length; ++n) window[n] = window[length - n];
  return window;
}

/// Sums of half segments; those of a whole segment are two of them. A missing sample makes its sums NaN.
std::vector<double> half_sums(std::span<const double> samples, std::size_t half) {
  std::vector<double> sums(samples.size() / half);
  for (std::size_t h = 0; h < sums.size(); ++h) {
    // Four partial sums: the addition does not wait for itself.
    const double* from = samples.data() + h * half;
    double part[4] = {0, 0, 0, 0};
    for (std::size_t n = 0; n + 4 <= half; n += 4) {
      for (std::size_t k = 0; k < 4; ++k) part[k] += from[n + k];
    }
    for (std::size_t n = half / 4 * 4; n < half; ++n) part[0] += from[n];
    sums[h] = (part[0] + part[1]) + (part[2] + part[3]);
  }
  return sums;
}

/// One record, segment after segment, through the window and into its bins.
class Segments {
 public:
  Segments(std::span<const double> samples, const std::vector<double>& window)
      : samples_(samples), window_(window), sums_(half_sums(samples, window.size() / 2)), transform_(window.size()) {
    // Any level near the samples' own: what is left of an offset is taken out exactly below.
    double sum = 0, count = 0;
    for (const double s : sums_) {
      if (!std::isfinite(s)) continue;
      sum += s;
      count += static_cast<double>(window.size() / 2);
    }
    reference_ = count > 0 ? sum / count : 0;
  }

  std::size_t count() const { return sums_.empty() ? 0 : sums_.size() - 1; }
  bool complete(std::size_t s) const { return std::isfinite(sums_[s] + sums_[s + 1]); }

  /// Bins of segment s less its mean. A Hann window carries a constant into the bins 0 and 1 only.
  void bins(std::size_t s, std::vector<Complex>& to) {
    const std::size_t length = window_.size();
    const double* from = samples_.data() + s * (length / 2);
    double* in = transform_.input().data();
    const double* w = window_.data();
    for (std::size_t n = 0; n < length; ++n) in[n] = (from[n] - reference_) * w[n];
    const auto out = transform_.run();
    std::copy(out.begin(), out.end(), to.begin());
    const double offset = (sums_[s] + sums_[s + 1]) - static_cast<double>(length) * reference_;  // mean times length
    to[0] -= offset / 2;
    to[1] += offset / 4;
  }

 private:
  std::span<const double> samples_;
  const std::vector<double>& window_;
  std::vector<double> sums_;
  RepeatedFourier transform_;
  double reference_ = 0;
};

/// Plain arrays of sums; the compiler turns the loop into vector instructions.
struct Sums {
  explicit Sums(std::size_t bins) : xx(bins), yy(bins), re(bins), im(bins), fourth(bins) {}
  std::vector<double> xx, yy, re, im, fourth;

  void add(const std::vector<Complex>& x, const std::vector<Complex>& y) {
    const double* a = reinterpret_cast<const double*>(x.data());
    const double* b = reinterpret_cast<const double*>(y.data());
    for (std::size_t k = 0; k < xx.size(); ++k) {
      const double xr = a[2 * k], xi = a[2 * k + 1], yr = b[2 * k], yi = b[2 * k + 1];
      const double power = xr * xr + xi * xi;
      xx[k] += power;
      fourth[k] += power * power;
      yy[k] += yr * yr + yi * yi;
      re[k] += xr * yr + xi * yi;
      im[k] += xr * yi - xi * yr;
    }
  }
};

}  // namespace

double TransferSpectra::coherence(std::size_t bin) const {
  const double both = xx[bin] * yy[bin];
  return both > 0 ? std::fmin(1.0, std::norm(xy[bin]) / both) : 0;
}

double TransferSpectra::averages() const {
  if (segments == 0) return 0;
  const double count = static_cast<double>(segments);
  return count / (1 + 2 * (1 - 1 / count) / 36);
}

TransferSpectra welch_spectra(std::span<const double> x, std::span<const double> y, std::size_t segment) {
  assert(x.size() == y.size() && segment >= 8 && segment % 2 == 0 && segment <= x.size());
  const std::size_t bins = segment / 2 + 1;
  const std::vector<double> window = hann(segment);
  Segments from_x(x, window), from_y(y, window);
  std::vector<Complex> of_x(bins), of_y(bins);
  Sums sums(bins);
  TransferSpectra spectra;
  spectra.segment = segment;
  for (std::size_t each = 0; each < from_x.count(); ++each) {
    if (!from_x.complete(each) || !from_y.complete(each)) continue;
    from_x.bins(each, of_x);
    from_y.bins(each, of_y);
    sums.add(of_x, of_y);
    ++spectra.segments;
  }
  double energy = 0;
  for (const double w : window) energy += w * w;
  const double count = static_cast<double>(std::max<std::size_t>(spectra.segments, 1));
  const double scale = 1 / (energy * count);
  spectra.xx.resize(bins);
  spectra.yy.resize(bins);
  spectra.xy.resize(bins);
  spectra.restlessness.resize(bins);
  for (std::size_t k = 0; k < bins; ++k) {
    spectra.xx[k] = scale * sums.xx[k];
    spectra.yy[k] = scale * sums.yy[k];
    spectra.xy[k] = scale * Complex(sums.re[k], sums.im[k]);
    const double square = sums.xx[k] * sums.xx[k];
    spectra.restlessness[k] = square > 0 ? count * sums.fourth[k] / square : std::nan("");
  }
  return spectra;
}

double random_error_of(double coherence, double averages) {
  if (!(coherence > 0) || !(averages > 0)) return std::numeric_limits<double>::infinity();
  return std::sqrt((1 - coherence) / (2 * coherence * averages));
}

WhiteNoise white_noise_of(const TransferSpectra& spectra, std::span<const std::size_t> bins) {
  // 1 - g of a bin scatters in proportion to itself, by 1/sqrt(averages). Weights come from the bins themselves first: a bin
  // with leakage then counts little; afterwards from the model, and such bins are left out.
  const double averages = spectra.averages(), chance = 1 / std::sqrt(averages);
  constexpr double kTooMuch = 2.5;
  WhiteNoise noise;
  for (int round = 0; round < 12; ++round) {
    double aa = 0, ab = 0, bb = 0, ac = 0, bc = 0, squares = 0;
    std::size_t used = 0;
    for (const std::size_t k : bins) {
      const double a = 1 / spectra.xx[k], b = 1 / spectra.yy[k], left = 1 - spectra.coherence(k);
      // The coherence comes out too large by left²/averages.
      const double c = left + left * left / averages + a * noise.x * b * noise.y;
      const double model = round == 0 ? c : noise.x * a + noise.y * b;
      if (!(model > 0) || c > model * (1 + kTooMuch * chance)) continue;
      // Once the level is about right, on both sides: what is left over by chance must not be cut off on one.
      if (round > 3 && c < model * (1 - kTooMuch * chance)) continue;
      const double weight = averages / (model * model);
      aa += weight * a * a;
      ab += weight * a * b;
      bb += weight * b * b;
      ac += weight * a * c;
      bc += weight * b * c;
      squares += averages * (c / model - 1) * (c / model - 1);
      ++used;
    }
    if (used == 0) break;
    noise.used = used;
    noise.misfit = squares / static_cast<double>(used);
    const double determinant = aa * bb - ab * ab;
    noise.told_apart = determinant > 1e-6 * aa * bb;
    if (noise.told_apart) {
      noise.x = (ac * bb - bc * ab) / determinant;
      noise.y = (bc * aa - ac * ab) / determinant;
      noise.u_x = std::sqrt(bb / determinant);
      noise.u_y = std::sqrt(aa / determinant);
    }
    if (!noise.told_apart || noise.x < 0) {
      // None of it is x's, or nobody can tell: then y's is all.
      noise.x = 0;
      noise.y = bb > 0 ? bc / bb : 0;
    } else if (noise.y < 0) {
      noise.y = 0;
      noise.x = aa > 0 ? ac / aa : 0;
    }
    if (!(noise.x + noise.y > 0)) break;
  }
  noise.u_x *= std::fmax(1, noise.misfit);
  noise.u_y *= std::fmax(1, noise.misfit);
  return noise;
}

}  // namespace coilassay

// Steady noise: averaged segments, and a second length of segment to check the first.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/waveform_parts.h"
#include "base/number_text.h"
#include "fitting/statistics.h"
#include "fitting/transfer_estimate.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;

constexpr std::size_t kShortest = 128;         // samples of a segment
constexpr std::size_t kUsual = 4096;           // a thousand points
constexpr std::size_t kLongest = 65536;
constexpr std::size_t kSegmentsInRecord = 16;  // at least: some thirty averages
constexpr std::size_t kLowestBin = 16;         // below, a window is too short to tell a slope from a level
constexpr double kHighest = 0.4;               // of the sample rate
constexpr double kLargestError = 0.08;
constexpr double kLeastCoherence = 0.8;
constexpr double kBiasCounts = 0.5;            // of the random error, r.m.s.: then longer segments are tried
constexpr double kBiasIsNoError = 0.1;         // of |Z|: a point whose bias may be more is left out
constexpr double kBiasKnown = 0.2;             // of the bias that is taken out: so much of it stays as an error
constexpr double kBiasNoise = 0.05;            // of the square of a point's error: what segments half as long scatter
constexpr double kNoiseKnown = 0.05;           // what a little leakage in the bins makes of the noise found from them
constexpr double kTooRestless = 3.5, kTooSteady = 1.4;   // 2 is noise

TransferSpectra spectra_of(const std::vector<WaveformPair>& records, std::size_t segment) {
  TransferSpectra sum;
  for (const WaveformPair& record : records) {
    TransferSpectra one = welch_spectra(record.amps, record.volts, segment);
    if (sum.segments == 0) {
      sum = std::move(one);
      continue;
    }
    if (one.segments == 0) continue;
    const double a = static_cast<double>(sum.segments), b = static_cast<double>(one.segments), both = a + b;
    for (std::size_t k = 0; k < sum.xx.size(); ++k) {
      const double fourth = a * sum.restlessness[k] * sum.xx[k] * sum.xx[k] + b * one.restlessness[k] * one.xx[k] * one.xx[k];
      sum.xx[k] = (a * sum.xx[k] + b * one.xx[k]) / both;
      sum.yy[k] = (a * sum.yy[k] + b * one.yy[k]) / both;
      sum.xy[k] = (a * sum.xy[k] + b * one.xy[k]) / both;
      sum.restlessness[k] = fourth / both / (sum.xx[k] * sum.xx[k]);
    }
    sum.segments += one.segments;
  }
  return sum;
}

/// Bins in which both channels hold the same signal. Every second one: neighbours share half their noise (Hann).
std::vector<std::size_t> carrying(const TransferSpectra& s) {
  std::vector<std::size_t> kept;
  const auto last = static_cast<std::size_t>(kHighest * static_cast<double>(s.segment));
  for (std::size_t k = kLowestBin; k <= last; k += 2) {
    const double g = s.coherence(k);
    if (g > kLeastCoherence && random_error_of(g, s.averages()) < kLargestError) kept.push_back(k);
  }
  return kept;
}

/// H1 with the current's noise taken out, and what stays uncertain about that.
struct Ratio {
  std::vector<Complex> value;
  std::vector<double> shared;     // relative change by one standard uncertainty
  ErrorLaw::Kind law = ErrorLaw::Kind::normal;
  double largest = 0;             // correction
};

/// Does the noise of two white channels explain what most bins leave over?
bool explained(const std::vector<std::size_t>& bins, const WhiteNoise& noise) {
  return noise.told_apart && noise.used >= 20 && 3 * noise.used > bins.size() && noise.misfit < 2;
}

Ratio ratio_of(const TransferSpectra& s, const std::vector<std::size_t>& bins) {
  Ratio ratio;
  const WhiteNoise noise = white_noise_of(s, bins);
  const bool white = explained(bins, noise);
  if (!white) ratio.law = ErrorLaw::Kind::rectangular;
  for (const std::size_t k : bins) {
    if (white) {
      ratio.value.push_back(s.xy[k] / (s.xx[k] - noise.x));
      ratio.shared.push_back(std::hypot(noise.u_x, kNoiseKnown * noise.x) / s.xx[k]);
      ratio.largest = std::max(ratio.largest, noise.x / s.xx[k]);
      continue;
    }
    // Somewhere between H1 and H2, whose ratio is the coherence; less what chance leaves of it.
    const double g = s.coherence(k), half = (1 / std::sqrt(g) - 1);
    ratio.value.push_back(s.h1(k) / std::sqrt(g));
    ratio.shared.push_back(half / std::sqrt(3.0));
    ratio.largest = std::max(ratio.largest, half);
  }
  return ratio;
}

double restlessness(const TransferSpectra& s, const std::vector<std::size_t>& bins) {
  std::vector<double> of;
  for (const std::size_t k : bins) of.push_back(s.restlessness[k]);
  return median(of);
}

void refuse(RatioPoints& points, std::string code, std::string why, const DrivenRecord& about, double figure) {
  points.findings.push_back({std::move(code), Severity::refusal, std::move(why), about.amp_name, figure, Unit::one});
}

/// One length of segment, looked at together with half of it.
struct Attempt {
  TransferSpectra spectra;
  std::vector<std::size_t> bins;
  Ratio ratio;
  std::vector<Complex> bias;         // relative, to be taken out
  std::vector<double> unexplained;   // what segments half as long show beyond it
  double bias_in_u = 0;              // r.m.s. of that over the random error
};

/// Slope and curvature over ln(bin) of a logarithm around one of the bins: y = p t + q t², t = ln(k/k_i), through the point itself.
struct Bend {
  Complex p = 0, q = 0;
};
template <class Log>
Bend bend_at(const std::vector<std::size_t>& bins, std::size_t i, const Log& log_ratio) {
  constexpr std::size_t kReach = 5;
  const std::size_t first = i < kReach ? 0 : i - kReach, end = std::min(bins.size(), i + kReach + 1);
  double n = 0, t1 = 0, t2 = 0, t3 = 0, t4 = 0;
  Complex y0 = 0, y1 = 0, y2 = 0;
  for (std::size_t j = first; j < end; ++j) {
    const double t = std::log(static_cast<double>(bins[j]) / static_cast<double>(bins[i]));
    const Complex y = log_ratio(bins[j], bins[i]);
    n += 1, t1 += t, t2 += t * t, t3 += t * t * t, t4 += t * t * t * t;
    y0 += y, y1 += t * y, y2 += t * t * y;
  }
  // Normal equations of a + p t + q t², by Cramer's rule.
  const double d = n * (t2 * t4 - t3 * t3) - t1 * (t1 * t4 - t3 * t2) + t2 * (t1 * t3 - t2 * t2);
  if (!(std::fabs(d) > 0)) return {};
  return {(n * (y1 * t4 - t3 * y2) - y0 * (t1 * t4 - t3 * t2) + t2 * (t1 * y2 - y1 * t2)) / d,
          (n * (t2 * y2 - y1 * t3) - t1 * (t1 * y2 - y1 * t2) + y0 * (t1 * t3 - t2 * t2)) / d};
}

/// A Hann window smears H over a bin or two, weighted by the current's spectrum S: to second order the relative bias is
/// (H''/2 + H' S'/S)/(3 H) in units of bins. In segments half as long it is four times as large: a third of their difference tells
/// the same, with more noise, and checks it.
void add_bias(Attempt& a, const TransferSpectra& half) {
  const std::size_t count = a.bins.size();
  a.bias.resize(count);
  a.unexplained.resize(count);
  if (count < 8) return;
  std::vector<Complex> rest(count);
  const TransferSpectra& s = a.spectra;
  for (std::size_t i = 0; i < count; ++i) {
    const std::size_t k = a.bins[i];   // even: segments half as long have it too
    const Bend h = bend_at(a.bins, i, [&s](std::size_t j, std::size_t at) { return std::log(s.h1(j) / s.h1(at)); });
    const Bend power = bend_at(a.bins, i, [&s](std::size_t j, std::size_t at) { return Complex(std::log(s.xx[j] / s.xx[at])); });
    const double square = 3.0 * static_cast<double>(k) * static_cast<double>(k);
    a.bias[i] = ((h.p * h.p - h.p + 2.0 * h.q) / 2.0 + h.p * power.p) / square;
    rest[i] = (half.h1(k / 2) / s.h1(k) - 1.0) / 3.0 - a.bias[i];
  }
  constexpr std::size_t kReach = 3;
  double sum = 0;
  for (std::size_t i = 0; i < count; ++i) {
    const std::size_t first = i < kReach ? 0 : i - kReach, end = std::min(count, i + kReach + 1);
    Complex mean = 0;
    for (std::size_t k = first; k < end; ++k) mean += rest[k] / static_cast<double>(end - first);
    const double u = random_error_of(s.coherence(a.bins[i]), s.averages());
    sum += std::norm(mean) / (2 * u * u + 1e-14);
    // What may be chance counts for nothing.
    a.unexplained[i] = std::sqrt(std::fmax(0, std::norm(mean) - 2 * kBiasNoise * u * u));
  }
  a.bias_in_u = std::sqrt(sum / static_cast<double>(count));
}

/// Random error of a point, from the mean over its neighbours: what lifts one bin by chance would lift its weight too.
double random_error_near(const Attempt& a, std::size_t i) {
  constexpr std::size_t kReach = 4;
  const std::size_t first = i < kReach ? 0 : i - kReach, end = std::min(a.bins.size(), i + kReach + 1);
  double square = 0;
  for (std::size_t k = first; k < end; ++k) square += std::pow(random_error_of(a.spectra.coherence(a.bins[k]), a.spectra.averages()), 2);
  return std::sqrt(square / static_cast<double>(end - first));
}

Attempt attempt(const std::vector<WaveformPair>& records, std::size_t segment) {
  Attempt a;
  a.spectra = spectra_of(records, segment);
  if (a.spectra.segments < 4) return a;
  a.bins = carrying(a.spectra);
  a.ratio = ratio_of(a.spectra, a.bins);
  add_bias(a, spectra_of(records, segment / 2));
  return a;
}

bool steady(RatioPoints& points, const Attempt& a, const DrivenRecord& about) {
  const double restless = restlessness(a.spectra, a.bins);
  if (a.spectra.averages() >= 8 && restless > kTooRestless) {
    refuse(points, "burst_cut",
           "the burst is neither steady noise nor does it begin and end at rest inside the record, so its errors cannot be "
           "told: capture it whole, with a quiet stretch before and after",
           about, restless);
    return false;
  }
  if (a.spectra.averages() >= 8 && restless < kTooSteady) {
    refuse(points, "burst_cut",
           "the excitation repeats itself: between its lines there is nothing to measure. Use noise, one burst with a quiet "
           "stretch before and after, or sines one by one",
           about, restless);
    return false;
  }
  return true;
}

}  // namespace

RatioPoints ratio_of_segments(const std::vector<WaveformPair>& records, double step_s, const DrivenRecord& about) {
  RatioPoints points;
  const std::size_t samples = records.front().volts.size(), most = samples * records.size() / kSegmentsInRecord;
  std::size_t segment = kShortest;
  while (2 * segment <= std::min(kUsual, most) && 2 * segment <= samples) segment *= 2;
  Attempt a = attempt(records, segment);
  if (a.spectra.segments < kSegmentsInRecord) {
    refuse(points, "too_few_samples",
           "a record that does not begin and end at rest is averaged over segments, and " + std::to_string(samples) +
               " samples hold too few of them: make it longer, or capture a burst with a quiet stretch before and after",
           about, static_cast<double>(samples));
    return points;
  }
  if (a.bins.empty()) return points;
  if (!steady(points, a, about)) return points;
  while (a.bias_in_u > kBiasCounts && 2 * segment <= std::min(kLongest, most)) {
    Attempt longer = attempt(records, 2 * segment);
    if (longer.bins.size() < a.bins.size()) break;
    segment *= 2;
    a = std::move(longer);
  }
  points.segment = segment;
  points.averages = a.spectra.averages();
  RatioPoints::Shared noise{"noise of the current", "data", a.ratio.law, {}};
  std::size_t left_out = 0;
  double worst_bias = 0;
  for (std::size_t i = 0; i < a.bins.size(); ++i) {
    if (std::abs(a.bias[i]) + a.unexplained[i] > kBiasIsNoError) {
      ++left_out;
      continue;
    }
    const std::size_t k = a.bins[i];
    points.frequency_hz.push_back(static_cast<double>(k) / (static_cast<double>(segment) * step_s));
    points.ratio.push_back(a.ratio.value[i] / (1.0 + a.bias[i]));
    points.u.push_back(std::hypot(random_error_near(a, i), kBiasKnown * std::abs(a.bias[i]), a.unexplained[i]) + 1e-7);
    noise.relative.emplace_back(a.ratio.shared[i]);
    worst_bias = std::max(worst_bias, a.unexplained[i]);
  }
  points.shared = {noise};
  const auto percent = [](double ratio) { return to_percent_text(ratio); };
  if (left_out > 0 || a.bias_in_u > kBiasCounts) {
    points.findings.push_back({"segment_bias", Severity::caution,
                               "segments of " + std::to_string(segment) + " samples and of half as many differ: the impedance changes within "
                               "their resolution. The errors are widened by up to " + percent(worst_bias) +
                                   (left_out > 0 ? ", and " + std::to_string(left_out) + " frequencies are left out" : std::string()) +
                                   "; a longer record resolves more",
                               about.volt_name, worst_bias, Unit::one});
  }
  if (a.ratio.law == ErrorLaw::Kind::rectangular && a.ratio.largest > 0.01) {
    points.findings.push_back({"input_noise", Severity::caution,
                               "whether the noise is the voltage's or the current's cannot be told from this record: the modulus may be off by up to " +
                                   percent(a.ratio.largest) + " where it is worst; drive harder, or use finer ranges",
                               about.amp_name, a.ratio.largest, Unit::one});
  } else if (a.ratio.largest > 0.01) {
    points.findings.push_back({"input_noise", Severity::note,
                               "noise of the current would make the impedance up to " + percent(a.ratio.largest) +
                                   " too small where it is worst; it was found from the coherence and is taken out",
                               about.amp_name, a.ratio.largest, Unit::one});
  }
  return points;
}

}  // namespace coilassay

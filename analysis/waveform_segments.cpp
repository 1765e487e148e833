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
constexpr std::size_t kLowestBin = 3;          // below, the window still sees the offset and the slowest drifts
constexpr double kHighest = 0.4;               // of the sample rate
constexpr double kLargestError = 0.15;
constexpr double kLeastCoherence = 0.8;
constexpr double kBiasCounts = 0.5;            // of the random error, r.m.s.: then longer segments are tried
constexpr double kBiasIsNoError = 0.1;         // of |Z|: a point whose bias may be more is left out
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
  for (std::size_t k = kLowestBin + 1; k <= last; k += 2) {
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
  std::vector<Complex> bias;     // relative, smoothed
  double bias_in_u = 0;          // r.m.s.
};

/// A Hann window smears H over a bin or two: the bias is H'' of it over 6 T², four times as large in segments half as long.
/// A third of the difference is therefore the bias of the longer ones; smoothed over neighbours, to be more than noise.
void add_bias(Attempt& a, const TransferSpectra& half) {
  const std::size_t count = a.bins.size();
  std::vector<Complex> raw(count);
  for (std::size_t i = 0; i < count; ++i) {
    const std::size_t k = a.bins[i];   // even: segments half as long have it too
    raw[i] = (half.h1(k / 2) / a.spectra.h1(k) - 1.0) / 3.0;
  }
  constexpr std::size_t kReach = 3;
  double sum = 0;
  a.bias.resize(count);
  for (std::size_t i = 0; i < count; ++i) {
    const std::size_t first = i < kReach ? 0 : i - kReach, end = std::min(count, i + kReach + 1);
    for (std::size_t k = first; k < end; ++k) a.bias[i] += raw[k] / static_cast<double>(end - first);
    const double u = random_error_of(a.spectra.coherence(a.bins[i]), a.spectra.averages());
    sum += std::norm(a.bias[i]) / (2 * u * u + 1e-14);
  }
  a.bias_in_u = count == 0 ? 0 : std::sqrt(sum / static_cast<double>(count));
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
  RatioPoints::Shared bias{"segment length", "data", ErrorLaw::Kind::normal, {}};
  RatioPoints::Shared noise{"noise of the current", "data", a.ratio.law, {}};
  std::size_t left_out = 0;
  double worst_bias = 0;
  for (std::size_t i = 0; i < a.bins.size(); ++i) {
    if (std::abs(a.bias[i]) > kBiasIsNoError) {
      ++left_out;
      continue;
    }
    const std::size_t k = a.bins[i];
    points.frequency_hz.push_back(static_cast<double>(k) / (static_cast<double>(segment) * step_s));
    points.ratio.push_back(a.ratio.value[i]);
    points.u.push_back(random_error_of(a.spectra.coherence(k), points.averages) + 1e-7);
    bias.relative.push_back(a.bias[i]);
    noise.relative.emplace_back(a.ratio.shared[i]);
    worst_bias = std::max(worst_bias, std::abs(a.bias[i]));
  }
  points.shared = {bias, noise};
  const auto percent = [](double ratio) { return to_percent_text(ratio); };
  if (left_out > 0 || a.bias_in_u > kBiasCounts) {
    points.findings.push_back({"segment_bias", Severity::caution,
                               "segments of " + std::to_string(segment) + " samples and of half as many differ: the impedance changes within "
                               "their resolution. The difference enters as an error of up to " + percent(worst_bias) +
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

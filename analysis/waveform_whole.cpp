// Records that begin and end at rest, transformed whole.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/waveform_parts.h"
#include "base/number_text.h"
#include "fitting/spectrum.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;

constexpr double kSmallAtRest = 0.1;       // of the burst's peak: noise of a steady signal is a quarter of its peak
constexpr double kHighest = 0.4;           // of the sample rate: beyond, what folds back comes from just above
constexpr double kLeastPower = 25;         // of a line over its noise, each channel
constexpr double kLeastPerRecord = 5;      // where many are added up
constexpr double kLargestError = 0.15;
constexpr double kLargestFold = 0.1;
constexpr double kCutTail = 0.02;          // of the peak
constexpr std::size_t kMostPoints = 2000;
constexpr double kRounding = 1e-7;         // of the transforms and of samples written with some digits

struct Level {
  double mean = 0, variance = 0, count = 0;
};
Level level_of(const double* from, std::size_t count) {
  Level level;
  level.count = static_cast<double>(count);
  for (std::size_t n = 0; n < count; ++n) level.mean += from[n] / level.count;
  for (std::size_t n = 0; n < count; ++n) level.variance += (from[n] - level.mean) * (from[n] - level.mean);
  level.variance /= level.count - 1;
  return level;
}

/// Sums of the lines of all records, and what is known of their noise.
struct Lines {
  std::vector<double> ii, vv;      // energies
  std::vector<Complex> iv;         // conj(I) V
  double i_noise = 0, v_noise = 0; // energy of the noise in one line of one record
  double i_tail = 0, v_tail = 0;   // amplitude left at the end, root of the sum of squares
  double i_peak = 0, v_peak = 0;
  double records = 1;
};

/// Energy of the noise in one line: the quiet ends' variance in every sample, and the converter's rounding where the burst
/// moves and the noise does not spread it.
double noise_energy(const QuietEnds& ends, double resolution, std::size_t samples) {
  double energy = ends.variance * static_cast<double>(samples);
  if (resolution > 0 && ends.variance < 0.16 * resolution * resolution) {
    energy += static_cast<double>(ends.active) * resolution * resolution / 12;
  }
  return energy;
}

Lines lines_of(const std::vector<WaveformPair>& records, const DrivenRecord& about) {
  Lines lines;
  const std::size_t samples = records.front().volts.size(), bins = samples / 2 + 1;
  lines.ii.resize(bins);
  lines.vv.resize(bins);
  lines.iv.resize(bins);
  lines.records = static_cast<double>(records.size());
  for (const WaveformPair& record : records) {
    const QuietEnds v = look_at_ends(record.volts, about.volt_resolution), i = look_at_ends(record.amps, about.amp_resolution);
    lines.v_noise += noise_energy(v, about.volt_resolution, samples) / lines.records;
    lines.i_noise += noise_energy(i, about.amp_resolution, samples) / lines.records;
    lines.v_tail = std::hypot(lines.v_tail, v.tail);
    lines.i_tail = std::hypot(lines.i_tail, i.tail);
    lines.v_peak = std::max(lines.v_peak, v.peak);
    lines.i_peak = std::max(lines.i_peak, i.peak);
    const auto of_v = fourier(record.volts), of_i = fourier(record.amps);
    for (std::size_t k = 0; k < bins; ++k) {
      lines.ii[k] += std::norm(of_i[k]);
      lines.vv[k] += std::norm(of_v[k]);
      lines.iv[k] += std::conj(of_i[k]) * of_v[k];
    }
  }
  return lines;
}

/// Lines whose both channels stand out of their noise.
std::vector<std::size_t> carrying(const Lines& lines) {
  std::vector<std::size_t> kept;
  const double least = std::max(kLeastPower, kLeastPerRecord * lines.records);
  const auto last = static_cast<std::size_t>(kHighest * 2 * static_cast<double>(lines.ii.size() - 1));
  for (std::size_t k = 1; k < std::min(last, lines.ii.size()); ++k) {
    const double v = lines.vv[k], i = lines.ii[k];
    if (!(v > least * lines.v_noise) || !(i > least * lines.i_noise)) continue;
    if (std::sqrt((lines.v_noise / v + lines.i_noise / i) / 2) < kLargestError) kept.push_back(k);
  }
  return kept;
}

/// Neighbouring lines taken together: H1 over them at the centre of their energy. The ratio of one line is not biased by noise of the
/// current; over n lines and records the sum of |I|² holds n - 1 times that noise too much.
struct Groups {
  std::vector<double> line;        // centre, in lines
  std::vector<Complex> ratio;
  std::vector<double> u;           // relative error
  std::vector<double> per_amp;     // what an error of 1 in every line of the current does to the ratio, relative
};

Groups grouped(const Lines& lines, const std::vector<std::size_t>& kept, std::size_t together) {
  Groups groups;
  for (std::size_t at = 0; at < kept.size();) {
    const std::size_t first = kept[at];
    double ii = 0, vv = 0, centre = 0, root = 0, count = 0;
    Complex iv = 0;
    for (; at < kept.size() && kept[at] < first + together; ++at) {
      const std::size_t k = kept[at];
      ii += lines.ii[k];
      vv += lines.vv[k];
      iv += lines.iv[k];
      centre += lines.ii[k] * static_cast<double>(k);
      root += std::sqrt(lines.ii[k]);
      count += lines.records;
    }
    groups.line.push_back(centre / ii);
    groups.ratio.push_back(iv / (ii - (count - 1) * lines.i_noise));
    groups.u.push_back(std::sqrt((lines.v_noise / vv + lines.i_noise / ii) / 2) + kRounding);
    groups.per_amp.push_back(root / ii);
  }
  return groups;
}

/// How much more the points scatter about a cubic through their four neighbours than their errors say, over some hundred
/// points around each; 1 when they do not.
std::vector<double> excess_scatter(const Groups& g) {
  const std::size_t count = g.line.size();
  std::vector<double> excess(count, 1.0);
  if (count < 30) return excess;
  std::vector<double> squares(count, std::nan(""));
  for (std::size_t i = 2; i + 2 < count; ++i) {
    const std::size_t near[4] = {i - 2, i - 1, i + 1, i + 2};
    if (g.line[i + 2] - g.line[i - 2] > 8 * (g.line[i + 1] - g.line[i])) continue;  // a gap
    Complex predicted = 0;
    double variance = std::norm(g.ratio[i]) * g.u[i] * g.u[i];
    for (const std::size_t a : near) {
      double weight = 1;
      for (const std::size_t b : near) {
        if (a != b) weight *= (g.line[i] - g.line[b]) / (g.line[a] - g.line[b]);
      }
      predicted += weight * g.ratio[a];
      variance += weight * weight * std::norm(g.ratio[a]) * g.u[a] * g.u[a];
    }
    squares[i] = std::norm(g.ratio[i] - predicted) / (2 * variance);
  }
  // The mean of a square of two components is 1, its median log 2.
  constexpr std::size_t kReach = 60;
  std::vector<double> around;
  for (std::size_t block = 0; block < count; block += 20) {
    const std::size_t first = block < kReach ? 0 : block - kReach, end = std::min(count, block + 20 + kReach);
    around.assign(squares.begin() + static_cast<std::ptrdiff_t>(first), squares.begin() + static_cast<std::ptrdiff_t>(end));
    const double ratio = std::sqrt(median(around) / std::numbers::ln2);
    if (!(ratio > 1.3)) continue;
    for (std::size_t i = block; i < std::min(count, block + 20); ++i) excess[i] = ratio;
  }
  return excess;
}

/// What folds back from beyond half the sample rate: the channel's level there, taken as the same on the other side.
double folded_level(const std::vector<double>& energy, double noise) {
  const std::size_t first = energy.size() * 9 / 10;
  double sum = 0;
  for (std::size_t k = first; k < energy.size(); ++k) sum += energy[k];
  const double mean = sum / static_cast<double>(energy.size() - first);
  // The mean of the noise's own lines scatters; only what is clearly above it counts.
  const double floor = noise * (1 + 3 / std::sqrt(static_cast<double>(energy.size() - first)));
  return mean > floor ? std::sqrt(mean - noise) : 0;
}

}  // namespace

QuietEnds look_at_ends(const std::vector<double>& samples, double resolution) {
  const std::size_t count = samples.size(), block = std::max<std::size_t>(16, count / 100);
  QuietEnds ends;
  if (count < 4 * block) return ends;
  const Level lead = level_of(samples.data(), block), tail = level_of(samples.data() + (count - block), block);
  for (const double s : samples) ends.peak = std::max(ends.peak, std::fabs(s - lead.mean));
  const double small = kSmallAtRest * ends.peak;
  ends.quiet = ends.peak > 0 && lead.variance < small * small && tail.variance < small * small &&
               std::fabs(tail.mean - lead.mean) < small;
  ends.variance = (lead.variance + tail.variance) / 2;
  // The end swings more than the beginning, or stands elsewhere: by more than chance.
  const double chance = 1 + 5 * std::sqrt(2 / lead.count);
  double left = 0;
  if (tail.variance > chance * lead.variance) {
    left += std::sqrt(2 * (tail.variance - lead.variance));
    ends.variance = lead.variance;
  }
  const double step = std::fabs(tail.mean - lead.mean);
  const double rounding = resolution > 0 ? 0.5 * resolution : 0;
  if (step > 4 * std::sqrt(2 * ends.variance / lead.count) + rounding) left += step;
  ends.tail = left;
  const double moved = (resolution > 0 ? resolution : 0) + 3 * std::sqrt(ends.variance);
  for (const double s : samples) ends.active += std::fabs(s - lead.mean) > moved;
  return ends;
}

RatioPoints ratio_of_whole(const std::vector<WaveformPair>& records, double step_s, const DrivenRecord& about) {
  RatioPoints points;
  points.segment = records.front().volts.size();
  points.averages = static_cast<double>(records.size());
  const Lines lines = lines_of(records, about);
  for (const auto& [tail, peak, name] : {std::tuple{lines.v_tail, lines.v_peak, about.volt_name},
                                         std::tuple{lines.i_tail, lines.i_peak, about.amp_name}}) {
    if (!(tail > kCutTail * peak)) continue;
    points.findings.push_back({"burst_cut", Severity::refusal,
                               to_percent_text(tail / peak) + " of the burst is still there at the end of the record: what came "
                               "after is missing at every frequency; make the record longer, or let the coil discharge faster",
                               name, tail / peak, Unit::one});
    return points;
  }
  const std::vector<std::size_t> kept = carrying(lines);
  // As few points as keep the impedance straight between them.
  std::size_t together = (kept.size() + kMostPoints - 1) / kMostPoints;
  Groups groups;
  std::vector<double> excess;
  for (;; together /= 2) {
    groups = grouped(lines, kept, std::max<std::size_t>(together, 1));
    excess = excess_scatter(groups);
    if (together <= 1 || *std::max_element(excess.begin(), excess.end()) == 1) break;
  }
  const double samples = static_cast<double>(records.front().volts.size());
  const double v_fold = folded_level(lines.vv, lines.records * lines.v_noise), i_fold = folded_level(lines.ii, lines.records * lines.i_noise);
  RatioPoints::Shared tail{"cut tail", "data", ErrorLaw::Kind::normal, {}}, fold{"sharp edges", "data", ErrorLaw::Kind::normal, {}};
  double worst_fold = 0, worst_tail = 0, worst_excess = 1;
  for (std::size_t i = 0; i < groups.line.size(); ++i) {
    const double angle = 2 * std::numbers::pi * groups.line[i] / samples;
    const double per_amp = groups.per_amp[i], per_volt = per_amp / std::abs(groups.ratio[i]);
    const double folded = std::hypot(v_fold * per_volt, i_fold * per_amp);
    if (folded > kLargestFold) continue;
    // A level that stays beyond the end lacks level/(1 - e^{-j angle}) in the transform.
    const double cut = std::hypot(lines.v_tail * per_volt, lines.i_tail * per_amp) / (2 * std::sin(angle / 2));
    points.frequency_hz.push_back(groups.line[i] / (samples * step_s));
    points.ratio.push_back(groups.ratio[i]);
    points.u.push_back(groups.u[i] * excess[i]);
    fold.relative.push_back(folded);
    tail.relative.push_back(cut);
    worst_fold = std::max(worst_fold, folded);
    worst_tail = std::max(worst_tail, cut);
    worst_excess = std::max(worst_excess, excess[i]);
  }
  const auto add = [&points](RatioPoints::Shared shared) {
    // Its phase is not known: half of it in each direction would be, so each direction gets the whole over sqrt 2.
    for (Complex& r : shared.relative) r *= std::numbers::sqrt2 / 2;
    RatioPoints::Shared turned = shared;
    for (Complex& r : turned.relative) r *= Complex(0, 1);
    points.shared.push_back(std::move(shared));
    points.shared.push_back(std::move(turned));
  };
  if (worst_tail > 1e-6) add(tail);
  if (worst_fold > 1e-6) add(fold);
  if (worst_tail > 0.01) {
    points.findings.push_back({"tail_cut", Severity::caution,
                               "a little of the burst is still there at the end of the record; at the lowest frequencies it is worth up to " +
                                   to_percent_text(worst_tail) + ": make the record longer",
                               about.amp_name, worst_tail, Unit::one});
  }
  if (worst_fold > 0.01) {
    points.findings.push_back({"sharp_edges", Severity::caution,
                               "the edges are sharper than the samples can follow: what lies beyond half the sample rate folds "
                               "back and is worth up to " + to_percent_text(worst_fold) +
                                   " at the highest frequencies; use slower edges, the scope's bandwidth limit or a shorter interval",
                               about.volt_name, worst_fold, Unit::one});
  }
  if (worst_excess > 1) {
    points.findings.push_back({"coloured_noise", Severity::note,
                               "the points scatter up to " + to_text(worst_excess, Unit::one, Script::utf8, 2) +
                                   " times more than the quiet ends of the record say; their errors are widened by as much",
                               about.amp_name, worst_excess, Unit::one});
  }
  return points;
}

}  // namespace coilassay

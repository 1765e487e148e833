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
// A line must stand out of its noise, by its neighbours' energy where the spectrum is smooth. Where it is not, by its own: noise
// that lifts a line over the limit would make the impedance too small, so that limit lies where noise lifts little.
constexpr double kLeastPower = 25, kLeastOwnPower = 100;
constexpr double kLeastPerRecord = 5;      // where many are added up
constexpr double kRough = 0.3;             // median of |line/neighbours - 1|: 0.7 for noise
constexpr double kOutOfPlace = 0.3;        // of its neighbours: a line that is less stands in a gap
constexpr std::size_t kNeighbours = 3;     // on either side
constexpr double kLargestError = 0.05;      // beyond, the error of a ratio is no longer normal
constexpr double kLargestFold = 0.1;
constexpr double kCutTail = 0.02;          // of the peak
constexpr std::size_t kMostPoints = 2000;
constexpr double kRounding = 1e-7;         // of the transforms and of samples written with some digits

/// Samples at each end of a record that tell its noise.
std::size_t quiet_block(std::size_t samples) { return std::max<std::size_t>(16, samples / 100); }

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

/// Noise of a record, from as much of its beginning and end as is at rest: block after block, as long as level and scatter stay.
struct QuietStretch {
  double variance = 0, samples = 0;
};
QuietStretch quiet_stretch(const std::vector<double>& samples, std::size_t block, const Level& lead, const Level& tail) {
  double squares = 0, dof = 0;
  const auto walk = [&](const Level& from, const auto& place) {
    const double sigma = std::sqrt(from.variance), n = from.count;
    for (std::size_t k = 0; k < samples.size() / block / 2; ++k) {
      const Level here = level_of(samples.data() + place(k), block);
      const bool at_rest = here.variance <= from.variance * (1 + 6 * std::sqrt(2 / n)) && std::fabs(here.mean - from.mean) <= 6 * sigma / std::sqrt(n);
      if (!at_rest) break;
      squares += here.variance * (n - 1);
      dof += n - 1;
    }
  };
  walk(lead, [block](std::size_t k) { return k * block; });
  // A tail that still swings is no measure of the noise.
  if (tail.variance <= lead.variance * (1 + 5 * std::sqrt(2 / lead.count))) {
    walk(tail, [&](std::size_t k) { return samples.size() - (k + 1) * block; });
  }
  return {squares / dof, dof};
}

/// Sums of the lines of all records, and what is known of their noise.
struct Lines {
  std::vector<double> ii, vv;      // energies
  std::vector<Complex> iv;         // conj(I) V
  std::vector<double> ii_near, vv_near;   // energies to be expected: means of the neighbours, or the lines' own
  bool rough = false;
  double i_noise = 0, v_noise = 0; // energy of the noise in one line of one record
  double i_tail = 0, v_tail = 0;   // amplitude left at the end, root of the sum of squares
  double i_peak = 0, v_peak = 0;
  double records = 1;
  double quiet = 0;                // samples that told the noise
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
    lines.quiet += std::min(v.samples, i.samples);
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

/// Mean over the neighbours, without the line itself and line 0.
std::vector<double> of_neighbours(const std::vector<double>& energy) {
  std::vector<double> mean(energy.size());
  for (std::size_t k = 1; k < energy.size(); ++k) {
    const std::size_t first = k <= kNeighbours ? 1 : k - kNeighbours, end = std::min(energy.size(), k + kNeighbours + 1);
    double sum = 0, count = 0;
    for (std::size_t j = first; j < end; ++j) {
      if (j == k) continue;
      sum += energy[j];
      count += 1;
    }
    mean[k] = count > 0 ? sum / count : energy[k];
  }
  return mean;
}

/// Which energies tell the errors: those of the neighbours keep the noise of a line out of its own weight.
void look_around(Lines& lines) {
  lines.ii_near = of_neighbours(lines.ii);
  lines.vv_near = of_neighbours(lines.vv);
  std::vector<double> away;
  for (std::size_t k = 1; k < lines.ii.size(); ++k) {
    if (lines.ii_near[k] > 400 * lines.records * lines.i_noise && lines.vv_near[k] > 400 * lines.records * lines.v_noise) {
      away.push_back(std::fabs(lines.ii[k] / lines.ii_near[k] - 1));
    }
  }
  lines.rough = away.size() >= 10 && median(away) > kRough;
  if (!lines.rough) return;
  lines.ii_near = lines.ii;
  lines.vv_near = lines.vv;
}

/// Lines whose both channels stand out of their noise.
std::vector<std::size_t> carrying(const Lines& lines) {
  std::vector<std::size_t> kept;
  const double least = std::max(lines.rough ? kLeastOwnPower : kLeastPower, kLeastPerRecord * lines.records);
  const auto last = static_cast<std::size_t>(kHighest * 2 * static_cast<double>(lines.ii.size() - 1));
  for (std::size_t k = 1; k < std::min(last, lines.ii.size()); ++k) {
    const double v = lines.vv_near[k], i = lines.ii_near[k];
    if (!(v > least * lines.v_noise) || !(i > least * lines.i_noise)) continue;
    if (lines.ii[k] < kOutOfPlace * i || lines.vv[k] < kOutOfPlace * v) continue;
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
    double ii = 0, ii_near = 0, vv_near = 0, centre = 0, root = 0, count = 0;
    Complex iv = 0;
    for (; at < kept.size() && kept[at] < first + together; ++at) {
      const std::size_t k = kept[at];
      ii += lines.ii[k];
      ii_near += lines.ii_near[k];
      vv_near += lines.vv_near[k];
      iv += lines.iv[k];
      centre += lines.ii[k] * static_cast<double>(k);
      root += std::sqrt(lines.ii[k]);
      count += lines.records;
    }
    groups.line.push_back(centre / ii);
    groups.ratio.push_back(iv / (ii - (count - 1) * lines.i_noise));
    groups.u.push_back(std::sqrt((lines.v_noise / vv_near + lines.i_noise / ii_near) / 2) + kRounding);
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

/// What folds back from beyond half the sample rate: the channel's level there, taken as the same on the other side. Its noise is
/// known from `quiet` samples; only what is clearly above it counts.
double folded_level(const std::vector<double>& energy, double noise, double quiet) {
  const std::size_t first = energy.size() * 9 / 10;
  double sum = 0;
  for (std::size_t k = first; k < energy.size(); ++k) sum += energy[k];
  const auto lines = static_cast<double>(energy.size() - first);
  const double mean = sum / lines;
  const double floor = noise * (1 + 5 * std::sqrt(1 / lines + 2 / quiet));
  return mean > floor ? std::sqrt(mean - noise) : 0;
}

}  // namespace

QuietEnds look_at_ends(const std::vector<double>& samples, double resolution) {
  const std::size_t count = samples.size(), block = quiet_block(count);
  QuietEnds ends;
  if (count < 4 * block) return ends;
  const Level lead = level_of(samples.data(), block), tail = level_of(samples.data() + (count - block), block);
  for (const double s : samples) ends.peak = std::max(ends.peak, std::fabs(s - lead.mean));
  const double small = kSmallAtRest * ends.peak;
  ends.quiet = ends.peak > 0 && lead.variance < small * small && tail.variance < small * small &&
               std::fabs(tail.mean - lead.mean) < small;
  const QuietStretch noise = quiet_stretch(samples, block, lead, tail);
  ends.variance = noise.variance;
  ends.samples = noise.samples;
  // The end swings more than the beginning, or stands elsewhere: by more than chance.
  const double chance = 1 + 5 * std::sqrt(2 / lead.count);
  double left = tail.variance > chance * lead.variance ? std::sqrt(2 * (tail.variance - lead.variance)) : 0;
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
  Lines lines = lines_of(records, about);
  for (const auto& [tail, peak, name] : {std::tuple{lines.v_tail, lines.v_peak, about.volt_name},
                                         std::tuple{lines.i_tail, lines.i_peak, about.amp_name}}) {
    if (!(tail > kCutTail * peak)) continue;
    points.findings.push_back({"burst_cut", Severity::refusal,
                               to_percent_text(tail / peak) + " of the burst is still there at the end of the record: what came "
                               "after is missing at every frequency; make the record longer, or let the coil discharge faster",
                               name, tail / peak, Unit::one});
    return points;
  }
  look_around(lines);
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
  const double v_fold = folded_level(lines.vv, lines.records * lines.v_noise, lines.quiet),
               i_fold = folded_level(lines.ii, lines.records * lines.i_noise, lines.quiet);
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

#include "analysis/decay_window.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "fitting/extremes.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

// A clean record gives chance > 1e-6 but for one in a million; early_z is the largest of several correlated signs.
constexpr double kImprobable = 1e-6;
constexpr double kEarlySign = 4.7;

/// Level the record ends on: median of at most some thousand samples of its last tenth.
double end_level(std::span<const double> y) {
  const auto tail = y.last(std::max<std::size_t>(y.size() / 10, 1));
  const std::size_t stride = tail.size() / 4096 + 1;
  std::vector<double> some;
  for (std::size_t i = 0; i < tail.size(); i += stride) some.push_back(tail[i]);
  return median(some);
}

double largest_deviation(std::span<const double> y, double level) {
  const auto [low, high] = extremes(y);
  return std::fmax(0, std::fmax(high - level, level - low));
}

/// Noise of a single sample by the median of its second differences: slow shapes and the few samples of an edge do not
/// count.
double sample_noise(std::span<const double> y) {
  std::vector<double> second;
  const std::size_t stride = y.size() / 4096 + 1;
  for (std::size_t i = 1; i + 1 < y.size(); i += stride) {
    const double d = y[i - 1] - 2 * y[i] + y[i + 1];
    if (!std::isnan(d)) second.push_back(std::fabs(d));
  }
  return second.empty() ? 0 : median(second) / 0.6745 / std::sqrt(6.0);
}

/// Means of consecutive blocks; a NaN in a block makes it NaN.
std::vector<double> means_of(std::span<const double> y, std::size_t block) {
  std::vector<double> means;
  for (std::size_t at = 0; at + block <= y.size(); at += block) {
    double sum = 0;
    for (std::size_t i = at; i < at + block; ++i) sum += y[i];
    means.push_back(sum / static_cast<double>(block));
  }
  return means;
}

/// First sample that has left rest: quiet before, far away after. 0 when the record does not begin at rest. Noise that
/// would hide the departure is averaged away in blocks; the block that holds the release is then left out.
std::size_t first_departure(std::span<const double> y, double level, double resolution) {
  const double code = std::isnan(resolution) ? 0 : resolution;
  const double noise = sample_noise(y);
  for (std::size_t block = 1; block <= std::max<std::size_t>(y.size() / 256, 1); block *= 4) {
    const std::vector<double> means = block > 1 ? means_of(y, block) : std::vector<double>();
    const std::span<const double> m = block > 1 ? std::span<const double>(means) : y;
    const double largest = largest_deviation(m, level);
    const double scatter_expected = noise / std::sqrt(static_cast<double>(block));
    if (0.25 * largest < 6 * scatter_expected && block * 4 <= y.size() / 256) continue;
    std::size_t far = 0;
    while (far < m.size() && !(std::fabs(m[far] - level) >= 0.25 * largest)) ++far;
    if (far < 8) return 0;
    const auto before = m.first(far - far / 8);
    const double rest = median(before);
    const double scatter = std::fmax(robust_deviation(before), 0.6 * code);
    if (scatter > 0.1 * largest) return 0;
    std::size_t last_quiet = far;
    while (last_quiet > 0 && !(std::fabs(m[last_quiet - 1] - rest) <= 4 * scatter)) --last_quiet;
    return block == 1 ? last_quiet : (last_quiet + 1) * block;
  }
  return 0;
}

/// Sample after the last edge of a channel that shows the drive; nullopt when it does not switch off for good.
std::optional<std::size_t> drive_release(std::span<const double> drive) {
  if (drive.size() < 16) return std::nullopt;
  const double after = end_level(drive);
  const double swing = largest_deviation(drive, after);
  const double scatter = robust_deviation(drive.last(drive.size() / 4));
  if (!(swing > 20 * scatter) || swing == 0) return std::nullopt;
  std::size_t edge = drive.size();
  while (edge > 0 && !(std::fabs(drive[edge - 1] - after) > 0.1 * swing)) --edge;
  if (edge == 0 || edge > drive.size() - 16) return std::nullopt;
  // A drive goes off at once; a channel that itself dies away (the current of the same ringing) tells nothing here.
  const std::size_t shortly = std::min(edge, std::max<std::size_t>(drive.size() / 100, 8));
  if (largest_deviation(drive.subspan(edge - shortly, shortly), after) < 0.5 * swing) return std::nullopt;
  return edge;
}

/// End of the last block whose scatter is near the largest: from there on a decay can only be free.
std::size_t surely_free(std::span<const double> y, double level) {
  const std::size_t block = std::max<std::size_t>(y.size() / 256, 1);
  std::vector<double> scatter;
  for (std::size_t at = 0; at + block <= y.size(); at += block) {
    double sum = 0;
    std::size_t present = 0;
    for (std::size_t i = at; i < at + block; ++i) {
      if (std::isnan(y[i])) continue;
      sum += (y[i] - level) * (y[i] - level);
      ++present;
    }
    scatter.push_back(present > 0 ? std::sqrt(sum / static_cast<double>(present)) : 0);
  }
  const double largest = *std::max_element(scatter.begin(), scatter.end());
  std::size_t last = 0;
  for (std::size_t k = 0; k < scatter.size(); ++k) {
    if (scatter[k] >= 0.85 * largest) last = k;
  }
  return std::min((last + 1) * block, y.size() - std::min<std::size_t>(y.size(), 16));
}

/// Uncertainty of the model's value at n (outside the window as well), quadrature included, from the fit's covariance.
double prediction_uncertainty(const DampedSineFit& fit, double n) {
  if (fit.fit.covariance.size() == 0) return 0;
  const DampedSine& m = fit.model;
  const double w = m.damped_omega();
  double total = 0;
  for (const double at : {n, w > 0 ? n - std::numbers::pi / (2 * w) : n}) {
    const double e = std::exp(-m.a * at);
    const double x = m.q * at * at;
    double c = 0, s = 0, ds = 0;
    if (std::fabs(x) < 1e-2) {
      c = 1 - x / 2;
      s = at * (1 - x / 6);
      ds = -at * at * at / 6;
    } else if (m.q > 0) {
      c = std::cos(w * at);
      s = std::sin(w * at) / w;
      ds = (at * c - s) / (2 * m.q);
    } else {
      const double k = std::sqrt(-m.q);
      c = std::cosh(k * at);
      s = std::sinh(k * at) / k;
      ds = (at * c - s) / (2 * m.q);
    }
    Eigen::VectorXd g(5);
    g << -at * e * (m.p * c + m.s * s), e * (-m.p * at * s / 2 + m.s * ds), e * c, e * s, 1;
    total += g.dot(fit.fit.covariance * g);
  }
  return std::sqrt(std::fmax(total, 0));
}

/// How much better the decay describes one sample than rest at the offset does, as a logarithm of likelihood.
double for_decay(double y, double model, double offset, double sigma) {
  const double rest = y - offset, decay = y - model;
  return std::isnan(rest) ? 0 : (rest * rest - decay * decay) / (2 * sigma * sigma);
}

/// Samples at the head of a window that rest describes better than the decay: the window began before the release.
std::size_t resting_head(std::span<const double> window, const DampedSineFit& fit, double sigma) {
  if (!(sigma > 0)) return 0;
  constexpr double kClearly = 8;
  const std::size_t reach = std::min<std::size_t>(window.size() / 2, 200000);
  double sum = 0, least = -kClearly;
  std::size_t cut = 0;
  for (std::size_t i = 0; i < reach; ++i) {
    sum += for_decay(window[i], fit.model(static_cast<double>(i)), fit.model.c, sigma);
    if (sum < least) {
      least = sum;
      cut = i + 1;
    }
  }
  return cut;
}

/// Carries the fit of [first, ...) backwards; the first sample that still agrees. Where noise hides single samples, the
/// release is where decay rather than rest has the most of all samples behind it.
std::size_t extend_backwards(std::span<const double> y, std::size_t first, const DampedSineFit& fit, double sigma,
                             double resolution) {
  const DampedSine& model = fit.model;
  const double w = model.damped_omega();
  const double amplitude = w > 0 ? model.envelope(0) : std::fabs(model.p);
  const std::size_t step =
      w > 0 ? std::clamp<std::size_t>(static_cast<std::size_t>(std::numbers::pi / (2 * w)), 1, 4096)
            : std::max<std::size_t>(y.size() / 512, 1);
  const double codes = std::isnan(resolution) ? 0 : resolution / 2;
  std::size_t agreed = first;
  double sum = 0, most = 0;
  std::size_t best = first;
  while (agreed > 0) {
    const std::size_t low = agreed > step ? agreed - step : 0;
    const double u = prediction_uncertainty(fit, static_cast<double>(low) - static_cast<double>(first));
    if (!(u < 0.3 * amplitude)) return best;
    const double limit = 5 * std::hypot(sigma, u) + codes;
    for (std::size_t i = agreed; i-- > low;) {
      const double predicted = model(static_cast<double>(i) - static_cast<double>(first));
      const double r = std::fabs(y[i] - predicted);
      if (sigma > 0) sum += for_decay(y[i], predicted, model.c, std::hypot(sigma, u));
      if (sum >= most || !(sigma > 0)) {
        most = sum;
        best = i;
      }
      if (sum < most - 15) return best;
      if (std::isnan(r) || r <= limit) continue;
      // One sample far off is a glitch, two of three are another law.
      std::size_t more = 0;
      for (std::size_t j = i; j > 0 && j + 2 > i; --j) {
        const double s = std::fabs(y[j - 1] - model(static_cast<double>(j - 1) - static_cast<double>(first)));
        if (s > limit) ++more;
      }
      if (more > 0 || i < 2) return std::max(best, i + 1);
    }
    agreed = low;
  }
  return best;
}

/// Where the envelope of an undithered record has fallen to one code: beyond, the quantiser hides the signal.
std::size_t end_of_codes(const DampedSineFit& fit, double sigma, double resolution, std::size_t length) {
  if (std::isnan(resolution) || sigma > 0.3 * resolution || fit.model.q <= 0 || fit.model.a <= 0) return length;
  const double n = std::log(fit.model.envelope(0) / resolution) / fit.model.a;
  if (!(n > 32) || n > static_cast<double>(length)) return length;
  return static_cast<std::size_t>(n);
}

class Search {
 public:
  Search(std::span<const double> y, const DecaySearch& search) : y_(y), search_(search) {}

  Result<Decay> run() {
    const std::size_t begin = search_.from.value_or(0);
    std::size_t end = std::min(search_.to.value_or(y_.size()), y_.size());
    if (begin >= end || end - begin < 16) {
      return failure(Problem::too_few_samples, "", "the window holds fewer than 16 samples", "widen --from and --to");
    }
    if (search_.from) return settle(fit_from(begin, end), begin);

    const auto record = y_.first(end);
    const double level = end_level(record);
    std::size_t release = first_departure(record, level, search_.resolution);
    if (const auto edge = drive_release(search_.drive); edge && *edge < end) release = *edge;

    Result<Decay> direct = fit_from(release, end);
    for (int tries = 0; tries < 3 && direct && direct->residuals.bad_head > 0 && plausible_head(*direct); ++tries) {
      const std::size_t next = direct->first + direct->residuals.bad_head;
      if (end - next < 32) break;
      Result<Decay> later = fit_from(next, end);
      if (!later) break;
      later->skipped = next - release;
      direct = std::move(later);
    }
    for (int tries = 0; tries < 4 && direct; ++tries) {
      const auto window = record.subspan(direct->first, direct->end - direct->first);
      const std::size_t cut = resting_head(window, direct->fit, std::fmax(direct->residuals.sigma, direct->fit.sigma));
      if (cut == 0 || window.size() - cut < 64) break;
      Result<Decay> later = fit_from(direct->first + cut, end);
      if (!later) break;
      release = later->first;
      direct = std::move(later);
    }
    if (direct && fits(*direct)) {
      direct->drive_before = stands_before(*direct);
      return settle(std::move(direct), release);
    }
    Result<Decay> backwards = from_behind(surely_free(record, level), end);
    if (!backwards) return settle(std::move(direct), release);
    // A short stretch at the very end is always easy to describe, and says next to nothing.
    const bool worth = !direct || 8 * (backwards->end - backwards->first) > direct->end - direct->first;
    const bool better = !direct || (worth && (backwards->residuals.lack_of_fit < 0.3 * direct->residuals.lack_of_fit ||
                                              (fits(*backwards) && !fits(*direct))));
    Result<Decay>& chosen = better ? backwards : direct;
    chosen->drive_before = stands_before(*chosen);
    return settle(std::move(chosen), release);
  }

 private:
  static bool fits(const Decay& d) { return d.residuals.chance > kImprobable && d.residuals.early_z < kEarlySign; }
  static bool plausible_head(const Decay& d) { return d.residuals.bad_head < 64; }

  Result<Decay> fit_from(std::size_t first, std::size_t end) const {
    const auto window = y_.subspan(first, end - first);
    Result<DampedSineFit> fit = fit_damped_sine(window, {search_.resolution, search_.near_omega});
    if (!fit) return failure(fit);
    Decay decay;
    decay.first = first;
    decay.end = end;
    decay.fit = std::move(*fit);
    decay.residuals = look_at_residuals(window, decay.fit.model, search_.resolution);
    const std::size_t stop =
        end_of_codes(decay.fit, decay.residuals.sigma, search_.resolution, window.size());
    if (stop < window.size()) {
      Result<DampedSineFit> shorter = fit_damped_sine(window.first(stop), {search_.resolution, search_.near_omega});
      if (shorter) {
        decay.end = first + stop;
        decay.fit = std::move(*shorter);
        decay.residuals = look_at_residuals(window.first(stop), decay.fit.model, search_.resolution);
      }
    }
    return decay;
  }

  /// Fits a stretch that is surely free and grows it towards the release.
  Result<Decay> from_behind(std::size_t first, std::size_t end) const {
    Result<Decay> decay = fit_from(first, end);
    for (int round = 0; decay && round < 6; ++round) {
      const std::size_t sooner =
          extend_backwards(y_, decay->first, decay->fit, decay->residuals.sigma, search_.resolution);
      if (sooner >= decay->first) break;
      Result<Decay> grown = fit_from(sooner, end);
      if (!grown) break;
      if (!fits(*grown) && fits(*decay)) break;
      decay = std::move(grown);
    }
    return decay;
  }

  /// Anything but rest before the window: the drive, or an earlier burst.
  bool stands_before(const Decay& decay) const {
    const std::size_t first = decay.first;
    const double level = decay.fit.model.c;
    if (first < 4) return false;
    double sum = 0, count = 0;
    for (std::size_t i = 0; i < first; ++i) {
      if (std::isnan(y_[i])) continue;
      sum += (y_[i] - level) * (y_[i] - level);
      count += 1;
    }
    const double amplitude = decay.fit.model.q > 0 ? decay.fit.model.envelope(0) : std::fabs(decay.fit.model.p);
    return count > 0 && std::sqrt(sum / count) > std::fmax(0.1 * amplitude, 6 * decay.residuals.sigma);
  }

  /// Moves the start while a transient shows, cuts a second burst, and keeps what the last move changed.
  Result<Decay> settle(Result<Decay> decay, std::size_t release) const {
    if (!decay) return decay;
    if (const std::size_t burst = second_burst(*decay); burst > 0) {
      Result<Decay> shorter = fit_from(decay->first, burst);
      if (shorter) {
        shorter->retriggered = true;
        shorter->drive_before = decay->drive_before;
        shorter->skipped = decay->skipped;
        decay = std::move(shorter);
      }
    }
    if (search_.from) return decay;
    const Decay unmoved = *decay;
    const double tau = decay->fit.model.a > 0 ? 1 / decay->fit.model.a : 0;
    for (int move = 0; move < 12 && decay->residuals.early_z >= kEarlySign; ++move) {
      const auto skip = static_cast<std::size_t>(std::fmax(0.03 * tau * std::pow(1.25, move), 1.0));
      if (decay->end - decay->first < skip + 64) break;
      Result<Decay> later = fit_from(decay->first + skip, decay->end);
      if (!later) break;
      if (move > 3 && later->residuals.early_z > 0.9 * decay->residuals.early_z) break;
      later->start_shift_a = later->fit.model.a - decay->fit.model.a;
      later->start_shift_q = later->fit.model.q - decay->fit.model.q;
      later->drive_before = decay->drive_before;
      later->retriggered = decay->retriggered;
      decay = std::move(later);
      decay->skipped = decay->first - std::min(release, decay->first);
    }
    // What a later start does not cure is no transient: another law, which the structure of the decay will show.
    if (decay->first != unmoved.first && !fits(*decay)) return unmoved;
    return decay;
  }

  /// Sample where a later stretch rises far above those before it although the envelope has fallen; 0 when none does.
  std::size_t second_burst(const Decay& decay) const {
    const auto& energy = decay.residuals.energy;
    if (decay.residuals.chance > kImprobable || energy.size() < 8) return 0;
    for (std::size_t k = 4; k < energy.size(); ++k) {
      const std::span<const double> before(energy.data(), k);
      if (energy[k] > 400 && energy[k] > 100 * *std::max_element(before.begin(), before.end())) {
        return decay.first + decay.residuals.position[k - 1];
      }
    }
    return 0;
  }

  std::span<const double> y_;
  const DecaySearch& search_;
};

}  // namespace

Result<Decay> find_decay(std::span<const double> y, const DecaySearch& search) {
  if (y.size() < 16) {
    return failure(Problem::too_few_samples, "", "the record holds " + std::to_string(y.size()) + " samples",
                   "capture at least some hundred samples of the decay");
  }
  return Search(y, search).run();
}

}  // namespace coilassay

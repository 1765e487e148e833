#include "acquire/synthetic/burst_source.h"

#include <cmath>
#include <numbers>

namespace coilassay::synthetic {

namespace {

constexpr double kPi = std::numbers::pi;
constexpr double kFade = 0.05;   // of a chirp, at each end

/// 0 before, 1 after, half a cosine of length `rise` around 0 between.
double edge(double t, double rise) {
  if (t <= -rise / 2) return 0;
  if (t >= rise / 2) return 1;
  return 0.5 + 0.5 * std::sin(kPi * t / rise);
}

}  // namespace

BurstSource::BurstSource(const DrivenBurstBench& bench, double step_s, double record_s, std::ptrdiff_t first)
    : bench_(bench), step_s_(step_s), record_s_(record_s), begin_s_(bench.pretrigger_fraction * record_s), at_(first),
      random_(bench.seed, 7) {
  if (bench.kind != BurstKind::noise) return;
  // Butterworth of four poles as two sections; its noise bandwidth is (pi/8)/sin(pi/8) of the corner.
  const double warped = std::tan(kPi * bench.to_hz * step_s);
  const double angles[] = {kPi / 8, 3 * kPi / 8};
  for (int k = 0; k < 2; ++k) {
    const double damping = 2 * std::cos(angles[k]);
    const double norm = 1 / (1 + damping * warped + warped * warped);
    low_[k] = {warped * warped * norm, 2 * warped * warped * norm, warped * warped * norm, 2 * (warped * warped - 1) * norm,
               (1 - damping * warped + warped * warped) * norm, 0, 0};
  }
  high_keep_ = std::exp(-2 * kPi * bench.from_hz * step_s);
  const double bandwidth = (kPi / 8) / std::sin(kPi / 8) * bench.to_hz;
  scale_ = bench.amplitude_v / std::sqrt(2 * bandwidth * step_s);
}

double BurstSource::Section::pass(double x) {
  const double y = b0 * x + s1;
  s1 = b1 * x - a1 * y + s2;
  s2 = b2 * x - a2 * y;
  return y;
}

double BurstSource::pulses_at(double t) const {
  // The spacing leaves as much room after the last pulse as between them.
  const double period = (record_s_ - begin_s_) / static_cast<double>(bench_.pulses);
  const double since = t - begin_s_;
  if (since < 0) return 0;
  const double index = std::floor(since / period);
  if (index >= static_cast<double>(bench_.pulses)) return 0;
  const double within = since - index * period - bench_.rise_s / 2;
  return bench_.amplitude_v * (edge(within, bench_.rise_s) - edge(within - bench_.width_s, bench_.rise_s));
}

double BurstSource::chirp_at(double t) const {
  const bool endless = bench_.filled >= 1;
  const double length = endless ? record_s_ : bench_.filled * (record_s_ - begin_s_);
  const double since = endless ? t : t - begin_s_;
  if (!endless && (since <= 0 || since >= length)) return 0;
  const double rate = (bench_.to_hz - bench_.from_hz) / length;
  const double cycles = bench_.from_hz * since + rate * since * since / 2;
  const double wave = bench_.amplitude_v * std::sin(2 * kPi * cycles);
  if (endless) return wave;
  const double fade = kFade * length;
  return wave * edge(since - fade / 2, fade) * edge(length - since - fade / 2, fade);
}

double BurstSource::noise() {
  const double low = low_[1].pass(low_[0].pass(scale_ * random_.normal()));
  high_ = high_keep_ * high_ + (1 - high_keep_) * low;
  return low - high_;
}

double BurstSource::next() {
  const double t = static_cast<double>(at_++) * step_s_;
  switch (bench_.kind) {
    case BurstKind::pulse: return pulses_at(t);
    case BurstKind::chirp: return chirp_at(t);
    case BurstKind::noise: return noise();
  }
  return 0;
}

}  // namespace coilassay::synthetic

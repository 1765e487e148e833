#include "base/random.h"

#include <bit>
#include <cassert>
#include <cmath>
#include <numbers>

namespace coilassay {
namespace {

/// SplitMix64 (Steele, Lea, Flood): one step of the counter, then a bijective mixing of it.
constexpr std::uint64_t kGoldenStep = 0x9e3779b97f4a7c15;

constexpr std::uint64_t mixed(std::uint64_t z) {
  z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9;
  z = (z ^ (z >> 27)) * 0x94d049bb133111eb;
  return z ^ (z >> 31);
}

/// Layers of equal area under exp(-x^2/2), x > 0 (Marsaglia and Tsang, ziggurat). Layer 0 is the rectangle up to the
/// tail's start together with the tail; edge[i] is the right edge of layer i, edge[i + 1] what lies surely under the curve.
struct Ziggurat {
  static constexpr int kLayers = 256;
  static constexpr double kTailStart = 3.6541528853610088;  // for 256 layers; the edges below then close at 0
  std::array<double, kLayers + 1> edge{};
  std::array<double, kLayers + 1> height{};

  Ziggurat() {
    const auto density = [](double x) { return std::exp(-x * x / 2); };
    const double area = kTailStart * density(kTailStart) +
                        std::sqrt(std::numbers::pi / 2) * std::erfc(kTailStart / std::numbers::sqrt2);
    edge[0] = area / density(kTailStart);
    edge[1] = kTailStart;
    for (std::size_t i = 2; i < kLayers; ++i) edge[i] = std::sqrt(-2 * std::log(area / edge[i - 1] + density(edge[i - 1])));
    edge[kLayers] = 0;
    for (std::size_t i = 0; i <= kLayers; ++i) height[i] = density(edge[i]);
  }
};

/// Gamma law of shape >= 1 and scale 1 (Marsaglia and Tsang 2000, squeeze left out).
double gamma_variate(Random& random, double shape) {
  const double d = shape - 1.0 / 3;
  const double c = 1 / std::sqrt(9 * d);
  while (true) {
    const double x = random.normal();
    const double v = std::pow(1 + c * x, 3);
    if (v <= 0) continue;
    const double u = 1 - random.uniform();  // (0, 1]: its logarithm is finite
    if (std::log(u) < x * x / 2 + d - d * v + d * std::log(v)) return d * v;
  }
}

}  // namespace

Random::Random(std::uint64_t seed, std::uint64_t stream) {
  // mixed() is a bijection: streams of one seed start at different counters, far apart.
  std::uint64_t counter = stream == 0 ? seed : seed ^ mixed(stream * kGoldenStep);
  for (std::uint64_t& word : state_) word = mixed(counter += kGoldenStep);
}

Random::Random(const std::array<std::uint64_t, 4>& state) : state_(state) {
  assert((state_[0] | state_[1] | state_[2] | state_[3]) != 0);
}

std::uint64_t Random::bits() {
  const std::uint64_t result = std::rotl(state_[0] + state_[3], 23) + state_[0];
  const std::uint64_t t = state_[1] << 17;
  state_[2] ^= state_[0];
  state_[3] ^= state_[1];
  state_[1] ^= state_[2];
  state_[0] ^= state_[3];
  state_[2] ^= t;
  state_[3] = std::rotl(state_[3], 45);
  return result;
}

double Random::uniform() { return static_cast<double>(bits() >> 11) * 0x1p-53; }

double Random::uniform(double low, double high) {
  const double x = low + (high - low) * uniform();
  return x < high ? x : low;  // rounding may reach the upper end, which does not belong
}

double Random::normal() {
  static const Ziggurat ziggurat;
  while (true) {
    const std::uint64_t word = bits();  // 8 bits choose the layer, 1 the sign, 53 others the place
    const std::size_t layer = word & 0xff;
    const double sign = (word & 0x100) != 0 ? -1.0 : 1.0;
    const double x = static_cast<double>(word >> 11) * 0x1p-53 * ziggurat.edge[layer];
    if (x < ziggurat.edge[layer + 1]) return sign * x;
    if (layer == 0) {
      // Marsaglia's method for the tail beyond its start.
      while (true) {
        const double beyond = -std::log(1 - uniform()) / Ziggurat::kTailStart;
        const double y = -std::log(1 - uniform());
        if (2 * y > beyond * beyond) return sign * (Ziggurat::kTailStart + beyond);
      }
    }
    const double low = ziggurat.height[layer], high = ziggurat.height[layer + 1];
    if (low + (high - low) * uniform() < std::exp(-x * x / 2)) return sign * x;
  }
}

double Random::student_t(double dof) {
  assert(dof > 0);
  if (std::isinf(dof)) return normal();
  const double z = normal();
  const double shape = dof / 2;
  // Below shape 1 the method does not hold: gamma(a) = gamma(a + 1) U^(1/a).
  const double gamma = shape >= 1 ? gamma_variate(*this, shape)
                                  : gamma_variate(*this, shape + 1) * std::pow(1 - uniform(), 1 / shape);
  return z * std::sqrt(shape / gamma);
}

std::uint64_t Random::below(std::uint64_t n) {
  assert(n > 0);
  const std::uint64_t surplus = (0 - n) % n;  // 2^64 mod n: so many of the lowest words would favour small results
  while (true) {
    const std::uint64_t word = bits();
    if (word >= surplus) return word % n;
  }
}

}  // namespace coilassay

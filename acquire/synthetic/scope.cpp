#include "acquire/synthetic/scope.h"

#include <algorithm>
#include <cassert>
#include <cmath>

namespace coilassay::synthetic {

Channel seen_through(const ScopeInput& input, std::string name, Unit unit, std::vector<double> true_samples,
                     Random& random) {
  assert(input.noise >= 0 && input.bits >= 0 && input.bits <= 24 && input.full_scale >= 0);
  Channel channel;
  channel.name = std::move(name);
  channel.unit = unit;
  channel.unit_stated = true;
  channel.samples = std::move(true_samples);
  double largest = 0;
  for (double& v : channel.samples) {
    v = input.gain * v + input.offset;
    if (input.noise > 0) v += input.noise * random.normal();
    largest = std::max(largest, std::fabs(v));
  }
  if (input.bits == 0) return channel;

  channel.full_scale = input.full_scale > 0 ? input.full_scale : largest > 0 ? 1.2 * largest : 1.0;
  const double half_codes = std::ldexp(1.0, input.bits - 1);
  channel.resolution = channel.full_scale / half_codes;
  for (double& v : channel.samples) {
    const double code = std::clamp(std::nearbyint(v / channel.resolution), -half_codes, half_codes - 1);
    v = code * channel.resolution + 0.0;  // no negative zero: code -0 is code 0
  }
  return channel;
}

}  // namespace coilassay::synthetic

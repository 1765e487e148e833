// A simulated scope: what a true waveform looks like after a real front end, converter and clock.
#pragma once

#include <cstddef>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "base/random.h"

namespace coilassay::synthetic {

/// When samples are taken. Sample `before` is the trigger, at time 0 exactly. The scope believes in its interval; its
/// clock is off by `error`: the true time of a sample is the one shown times (1 + error).
struct Timebase {
  std::size_t samples = 0;
  std::size_t before = 0;  // samples ahead of the trigger
  double interval_s = 0;   // as shown
  double error = 0;        // ratio

  double true_time_s(std::size_t n) const {
    const double step = static_cast<double>(n) - static_cast<double>(before);
    return step * (interval_s * (1 + error));
  }
  /// As the scope states it.
  TimeAxis axis() const { return {-static_cast<double>(before) * interval_s, interval_s, {}}; }
};

/// One input. Shown value = quantised(gain * true + offset + noise); all in the unit of the channel.
struct ScopeInput {
  double gain = 1;
  double offset = 0;
  double noise = 0;       // r.m.s. of white Gaussian noise ahead of the converter
  int bits = 0;           // 0: no quantisation; otherwise 1 to 24
  double full_scale = 0;  // half range; 0: 1.2 times the largest magnitude ahead of the converter (1 when all is zero)
};

/// Looks at true samples through an input.
///
/// The converter is a mid-tread one in two's complement: codes -2^(bits-1) ... 2^(bits-1) - 1 of full_scale /
/// 2^(bits-1) each, rounded to the nearest, clipped at both ends. The channel then states `resolution` and
/// `full_scale`; without bits both stay NaN.
Channel seen_through(const ScopeInput& input, std::string name, Unit unit, std::vector<double> true_samples,
                     Random& random);

}  // namespace coilassay::synthetic

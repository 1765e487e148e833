// What drives a simulated burst, point after point of a fine grid.
#pragma once

#include <cstddef>

#include "acquire/synthetic/driven_burst.h"
#include "base/random.h"

namespace coilassay::synthetic {

/// The source's voltage without load. `next()` gives it at the points k = first, first + 1, ... of a grid of `step_s`,
/// whose point 0 is the beginning of the record.
class BurstSource {
 public:
  BurstSource(const DrivenBurstBench& bench, double step_s, double record_s, std::ptrdiff_t first);
  double next();

 private:
  double pulses_at(double t) const;
  double chirp_at(double t) const;
  double noise();

  /// Two poles and, for the low pass, two zeros at half the rate (bilinear transform).
  struct Section {
    double b0 = 0, b1 = 0, b2 = 0, a1 = 0, a2 = 0, s1 = 0, s2 = 0;
    double pass(double x);
  };

  const DrivenBurstBench& bench_;
  double step_s_, record_s_, begin_s_;
  std::ptrdiff_t at_;
  Random random_;
  Section low_[2];
  double high_ = 0, high_keep_ = 1, scale_ = 1;
};

}  // namespace coilassay::synthetic

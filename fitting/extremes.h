// Smallest and largest of many samples, at about the speed of reading them.
#pragma once

#include <span>

namespace coilassay {

struct Extremes {
  double low, high;   // +infinity and -infinity when every sample is NaN
};

/// NaN are passed over.
Extremes extremes(std::span<const double> values);

}  // namespace coilassay

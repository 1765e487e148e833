// How far the limits of a proof give way in a run of less than full size: 2.6 standard deviations of what so few trials leave
// open (one false call in a hundred per limit). At full size nothing gives way.
#pragma once

#include <cmath>

namespace coilassay {

struct Slack {
  bool full = true;

  /// Of a share near 0.95 found from so many trials.
  double share(double tried) const { return full ? 0 : 2.6 * std::sqrt(0.95 * 0.05 / tried); }
  /// Of a ratio of variances found from so many independent squares.
  double variance(double squares) const { return full ? 0 : 2.6 * std::sqrt(2 / squares); }
  /// Limits on single cells say nothing with so few trials in each.
  bool judges_cells() const { return full; }
};

}  // namespace coilassay

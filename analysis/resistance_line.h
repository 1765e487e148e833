// The line through four-wire readings, and whether the winding warmed while they were taken.
#pragma once

#include <cmath>
#include <vector>

#include "analysis/resistance_readings.h"

namespace coilassay {

struct ResistanceLine {
  enum class Story {
    measured,
    too_few,      // readings, to see their scatter
    no_current,
  } story = Story::too_few;
  std::size_t needed = 0;        // too_few: readings that would do
  bool both_sides = false;       // polarities, or readings with the current off
  double resistance_ohm = std::nan("");
  double u_ohm = std::nan("");   // from the scatter
  double dof = 0;
  double offset_v = std::nan(""), u_offset_v = std::nan("");   // both sides only
  double residual_v = std::nan("");                            // r.m.s.
  double half_swing_a = 0;       // an error of a reading that has the same sign on both sides divides by this at most

  bool drifts = false;           // beyond chance
  double drift_ratio = 0;        // change of R over the record, relative
  double drift_half_width_ohm = 0;   // how far R was off its mean at either end

  /// -1, 0, 1 for each reading: its polarity, 0 with the current off.
  std::vector<int> side;
};

ResistanceLine fit_resistance(const ResistanceReadings& readings);

}  // namespace coilassay

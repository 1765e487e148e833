// Pairs of voltage and current in the order in which they were read.
#pragma once

#include <cmath>
#include <vector>

#include "analysis/driven_capture.h"
#include "analysis/resistance.h"

namespace coilassay {

struct ResistanceReadings {
  std::vector<double> volts, amps;   // pairs with either one missing are left out
  std::vector<double> order;         // seconds since the first reading, or the number of the reading counted from 1
  bool timed = false;                // order is in seconds
  bool from_scope = false;
  double volt_step = std::nan("");   // last digit that is seen to change; NaN: not known
  double amp_step = std::nan("");
  InputError voltage_gain, current_gain;   // ratios around 1
  std::vector<Correction> corrections;
  std::vector<Finding> findings;

  std::size_t size() const { return volts.size(); }
};

/// Scales every capture as the bench says and puts them one after the other. Time is only for the order: several captures,
/// or one without it, are counted. missing_column, usage: see driven_record().
Result<ResistanceReadings> readings_of(const std::vector<Capture>& captures, const ResistanceRequest& request);

}  // namespace coilassay

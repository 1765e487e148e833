// From the joint solution to quantities with intervals.
#pragma once

#include "analysis/coupling.h"
#include "analysis/coupling_solution.h"
#include "analysis/measurement.h"

namespace coilassay {

/// What is said about k, and why.
struct CouplingVerdict {
  bool shown = false;           // k has a value
  double short_over_open = 0;   // inductance shorted over open where files show that it is larger, more than chance explains; else 0
  bool beyond = false;          // best value beyond what is possible, more than chance explains
  bool labels_swapped = false;  // aiding reads less than opposing, more than chance explains
  double best = std::nan("");   // of k, within what is possible
  double low = std::nan(""), high = std::nan("");
  bool at_low = false, at_high = false;
};

/// Adds estimates, bounds, budget, correlations, points, inputs and equivalents.
CouplingVerdict add_coupling(Measurement& result, const CouplingSolution& solution, const CouplingRequest& request);

/// Standard uncertainty that readings leave in the solution's k, were they what the solution predicts, and its interval: for
/// advice.
CouplingVerdict coupling_verdict(const CouplingSolution& solution, bool sign_known);

}  // namespace coilassay

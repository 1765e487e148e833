// Which measurements tell the coupling of two windings how well, before anything is measured or after.
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "analysis/coupling_circuit.h"
#include "base/result.h"

namespace coilassay {

struct CouplingAdviceRequest {
  double l1_h = 0, l2_h = 0, k = 0;      // roughly
  double accuracy = 0.01;                // half-width of the error of each inductance, relative, independent
  double ratio_accuracy = 0.01;          // of each voltage ratio
  std::optional<double> wanted;          // half-width of the interval, of k or of 1 - k, whichever is smaller
};

struct CouplingMethod {
  std::string name;                      // "open_short_primary"
  std::string words;                     // "primary open and shorted"
  std::vector<CouplingItem> items;
  double low = 0, high = 0;              // predicted 95 % interval of k
  bool at_low = false, at_high = false;  // only a limit
  double u = 0;                          // standard uncertainty of k; NaN where only a limit is to be had
  std::optional<bool> reaches;           // what is wanted
};

struct CouplingAdvice {
  CouplingAdviceRequest request;
  std::vector<CouplingMethod> methods;   // single ones, then all together
  std::string best;                      // the single method with the narrowest interval
  std::vector<std::string> sufficient;   // those that reach what is wanted, fewest items first
};

/// Predicted by the joint solution of what ideal windings would read (docs/formulas.md#coupling), for each method by itself and
/// for all together. bad_number for windings that cannot be.
Result<CouplingAdvice> advise_coupling(const CouplingAdviceRequest& request);

}  // namespace coilassay

// Errors of a measured impedance that move all of its points together, in the form a fit over frequency can carry on.
#pragma once

#include <complex>
#include <string>
#include <vector>

#include "fitting/propagation.h"

namespace coilassay {

/// One independent error of a sweep, such as that of a fixture's standard or of a gain, and what it does to first order:
/// with the error at e standard uncertainties every point i is off by e * dz_ohm[i]. To what is computed from the
/// sweep it therefore contributes the change that z_ohm + dz_ohm makes, as one line of the budget.
struct ImpedanceErrorTerm {
  std::string source;                             // "load standard", "voltage gain"
  ErrorLaw law;                                   // standard_uncertainty is 1: dz_ohm is per one of it
  char kind = 'B';
  bool common = true;                             // the same for every unit measured with this fixture or bench
  std::string basis;                              // "stated", "default: ..."
  std::vector<std::complex<double>> dz_ohm;       // per point of the sweep
};

}  // namespace coilassay

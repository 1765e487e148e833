// Which points of a sweep no passive, linear, causal circuit could have made.
#pragma once

#include <complex>
#include <cstddef>
#include <vector>

#include "base/result.h"
#include "fitting/circuit_fit.h"

namespace coilassay {

struct KramersKronig {
  std::vector<double> frequency_hz;             // of the points used, rising
  std::vector<std::size_t> index;               // of each of them in the data
  std::vector<std::complex<double>> residual;   // relative: (z - z_model)/|z|, of each of them
  std::vector<double> predicted_u;              // of each residual's parts by the errors of the data
  std::size_t elements = 0;                     // of the chain of relaxations
  double mu = 1;                                // how far positive and negative elements have begun to play against each other
  double chi_square = 0, dof = 0;
  double probability = 1;                       // of so large a chi-square by chance; small: the sweep as a whole is not causal
  double scale = 1;                             // residuals are this many times u (1 when the scale is known)
  std::vector<std::size_t> not_causal;          // indices in the data of points beyond what chance explains
  bool passed = true;                           // no such point, and the probability not below 1 in 2000
};

/// The linear Kramers-Kronig test (Boukamp, J. Electrochem. Soc. 142 (1995) 1885): a model that is causal whatever its
/// coefficients is fitted by linear least squares, so what it does not follow is not causal. The number of elements follows the
/// data (Schoenleber, Klotz, Ivers-Tiffee, Electrochim. Acta 131 (2014) 20).
///
/// @return too_few_samples: fewer than 10 points, or no phase; rank_deficient.
/// @see docs/formulas.md#causality
Result<KramersKronig> test_kramers_kronig(const CircuitData& data);

}  // namespace coilassay

// Which points of a sweep no passive, linear, causal circuit could have made.
#pragma once

#include <complex>
#include <cstddef>
#include <optional>
#include <vector>

#include "base/result.h"
#include "fitting/circuit_fit.h"

namespace coilassay {

struct KramersKronig {
  std::vector<double> frequency_hz;             // of the points used, rising
  std::vector<std::size_t> index;               // of each of them in the data
  std::vector<std::complex<double>> residual;   // data less causal model of each of them: of ln z (relative error, phase in rad),
                                                // or of S for reflections
  std::vector<double> predicted_u;              // standard deviation of the parts of each residual by the errors of the data
  std::size_t elements = 0;                     // relaxations in the model
  double mu = 1;                                // how little positive and negative ones play against each other
  double chi_square = 0, dof = 0;               // of the points that are not in not_causal, by u
  double scale = 1;                             // errors are this many times u (1 when the scale is known)
  double probability = 1;                       // of so large a chi-square, or such likeness of neighbours, by chance
  std::vector<std::size_t> not_causal;          // indices in the data of points beyond what chance explains
  bool passed = true;                           // no such point, and the probability not below 1 in 2000
};

/// The linear Kramers-Kronig test (Boukamp, J. Electrochem. Soc. 142 (1995) 1885) of ln z: a model that is causal whatever its
/// coefficients is fitted by linear least squares, so what it does not follow is not causal. The number of elements follows the
/// data (Schoenleber, Klotz, Ivers-Tiffee, Electrochim. Acta 131 (2014) 20, and chi-square).
///
/// `about`: a circuit near the data, the chosen one; being causal itself it does not change the question, it only lets
/// resonances be followed. Nothing: choose_circuit looks for one first, which costs ten times the test.
///
/// @return too_few_samples: fewer than 12 points, or no phase; what choose_circuit returns when `about` is missing.
/// @see docs/formulas.md#causality
Result<KramersKronig> test_kramers_kronig(const CircuitData& data, const std::optional<Circuit>& about = std::nullopt);

}  // namespace coilassay

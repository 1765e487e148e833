// Simulated coupled windings: the circuit's equations solved exactly, for every way they can be connected to an analyser.
#pragma once

#include <complex>
#include <cstdint>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "acquire/capture.h"
#include "base/result.h"

namespace coilassay::synthetic {

/// One winding: R and the skin law (1+j) R_skin sqrt(f/1 MHz) in series with L, C across.
struct Winding {
  double inductance_h = 100e-6;
  double resistance_ohm = 0;
  double skin_ohm = 0;           // at 1 MHz
  double capacitance_f = 0;
};

/// Two or three windings. coupling[p] is that of the pairs 1-2, 1-3, 2-3; negative for dots that lie opposite.
struct CoupledWindings {
  std::vector<Winding> windings = {{}, {}};
  std::vector<double> coupling = {0.5};
  double link_h = 0, link_ohm = 0;      // what serves as a short
  bool swapped_ports = false;           // the analyser's leads are exchanged: files say 1 where 2 is
  double not_reciprocal = 0;            // ratio by which Z12 of the port file is larger than Z21: a faulty file
  double noise_ratio = 0;               // of each number, relative to its size, half of its power in each part
  double first_hz = 1e3, last_hz = 1e6;
  std::size_t points = 61;              // even in ratio
  std::uint64_t seed = 1;
};

/// What can be connected; the names are those of the coupling command's options.
enum class Connection { primary_open, primary_short, secondary_open, secondary_short, aiding, opposing };
std::string_view name(Connection connection);

struct CoupledTruth {
  double l1_h, l2_h, m_h, k, n, leak1_h, leak2_h;   // of the first two windings, as the files name them
};

/// bad_number for windings that cannot be: a coupling matrix that is not positive definite included.
Result<CoupledTruth> coupled_truth(const CoupledWindings& windings);

/// Impedance of the first two windings so connected, a third one open; as a one-port sweep with its noise.
Result<Sweep> simulate_connection(const CoupledWindings& windings, Connection connection);
/// All windings as an n-port sweep of impedances.
Result<Sweep> simulate_ports(const CoupledWindings& windings);

/// Exact values without noise, for tests: impedance of a connection; open-circuit voltage of winding `to` over that across
/// winding `from` (0 or 1).
std::complex<double> exact_impedance(const CoupledWindings& windings, Connection connection, double frequency_hz);
std::complex<double> exact_ratio(const CoupledWindings& windings, std::size_t from, std::size_t to, double frequency_hz);

}  // namespace coilassay::synthetic

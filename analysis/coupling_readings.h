// Every input of a coupling measurement brought to one form: readings, each with its own error, and errors they share.
#pragma once

#include <complex>
#include <string>
#include <utility>
#include <vector>

#include "analysis/coupling.h"
#include "analysis/coupling_circuit.h"
#include "base/finding.h"
#include "fitting/propagation.h"

namespace coilassay {

/// Relative noise below which nothing is believed: digits of files, and what a solution still tells apart from a shared error.
inline constexpr double kLeastCouplingNoise = 1e-5;

/// One number that was read: an inductance or the size of a ratio (`real`), or a complex impedance or ratio.
struct CouplingReading {
  double omega = std::nan("");       // NaN: no frequency, the ideal value
  bool real = true;
  double size = 0;                   // of a real one, in henry or one
  std::complex<double> z;            // of a complex one
  double u_size = 0, u_angle = 0;    // of a real one: absolute; of a complex one: relative, and in rad
  double reference = 0;              // size in whose units a complex residual is taken where the noise is large; 0: its own
  std::vector<std::pair<std::size_t, std::complex<double>>> shared;   // index of an error, and what one u of it does to ln z
};

/// Readings of one item from one source.
struct CouplingTrace {
  CouplingItem item = CouplingItem::primary_open;
  std::string source;       // name in the budget: "primary open"
  std::string file;         // empty for a value
  ErrorLaw::Kind law = ErrorLaw::Kind::normal;
  char kind = 'B';
  std::string basis = "stated";
  bool scatter = false;     // its own scatter says how much it is worth
  std::vector<CouplingReading> readings;
};

/// An error of unit variance that several readings share.
struct SharedError {
  std::string source;
  ErrorLaw::Kind law = ErrorLaw::Kind::normal;
  char kind = 'B';
  bool common = true;       // of the bench, the same for every unit
  std::string basis = "stated";
};

struct CouplingReadings {
  std::vector<CouplingTrace> traces;
  std::vector<SharedError> shared;
  std::vector<SourceRecord> sources;
  std::vector<Finding> findings;
  bool sign_shown = false;      // by a complex mutual impedance or ratio
  bool shows_m = false;         // some item tells M itself, not only its square
  bool complex_read = false;    // resistances can be seen
  double peak_v = std::nan(""); // largest test voltage known
  double level_a = std::nan("");
};

/// @return usage: a file with the wrong number of ports, a value whose frequency is not clear.
Result<CouplingReadings> coupling_readings(const CouplingRequest& request);

}  // namespace coilassay

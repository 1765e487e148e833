// Two coupled windings as an exact circuit, and what each kind of measurement would read on it.
#pragma once

#include <complex>
#include <optional>
#include <span>
#include <string>
#include <string_view>

namespace coilassay {

/// A way to measure a pair of windings.
enum class CouplingItem {
  primary_open,
  primary_short,
  secondary_open,
  secondary_short,
  aiding,
  opposing,
  ratio_forward,   // open-circuit voltage of the secondary over the voltage across the primary
  ratio_reverse,
  mutual_12,       // Z12 and Z21 of a two-port file; its Z11 and Z22 are the open windings
  mutual_21,
};

std::string_view name(CouplingItem item);      // "primary_open", as in documents
std::string_view in_words(CouplingItem item);  // "primary open"
std::string_view option_of(CouplingItem item); // "--primary-open"
bool is_ratio(CouplingItem item);
/// Whether it tells M itself (with a sign), and not only its square.
bool shows_sign(CouplingItem item);

/// Winding i is R_i + (1+j) S_i sqrt(f/f_skin) + j w L_i in series, C_i across it; the windings are coupled by M. A "short"
/// is a link of its own inductance and resistance across the other winding.
struct WindingPair {
  double l1_h = 0, l2_h = 0;
  double m_squared_h2 = 0;   // may be negative while a fit is on its way
  double m_h = 0;            // signed; only read by items that show the sign
  double r1_ohm = 0, r2_ohm = 0;
  double skin1_ohm = 0, skin2_ohm = 0, skin_hz = 1;
  double c1_f = 0, c2_f = 0;
  double link_h = 0, link_ohm = 0;
};

/// Impedance in ohm, or a voltage ratio, at w rad/s. docs/formulas.md#coupling.
std::complex<double> predicted(CouplingItem item, const WindingPair& pair, double omega);

/// Inductance in henry, or a voltage ratio, where resistances and capacitances do not count: the value of an item whose
/// frequency nobody stated.
double predicted_ideal(CouplingItem item, const WindingPair& pair);

}  // namespace coilassay

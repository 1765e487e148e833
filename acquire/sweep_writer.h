// Writes impedance against frequency in formats the readers read back.
#pragma once

#include <iosfwd>
#include <string>

#include "acquire/capture.h"

namespace coilassay {

/// Columns of a written table.
enum class SweepColumns {
  impedance,        // Re(Z), Im(Z)
  scattering,       // Re(S11), Im(S11) at the sweep's reference, 50 ohm when it has none
  inductance,       // Ls, Rs
  magnitude_phase,  // |Z|, angle in degrees
  magnitude,        // |Z| alone
};

/// A one-port sweep as a table: key,value rows for what it brought along (and the reference of S), a row of headings with
/// units, "frequency [Hz],Re(Z) [ohm],Im(Z) [ohm]", then numbers as the shortest text that reads back to the same double.
/// A column `status` (1: bad) when a point is marked. Impedances come back bit for bit; the other columns to rounding.
void write_sweep_csv(std::ostream& out, const Sweep& sweep, SweepColumns columns);

/// Touchstone 1.1 (open IBIS file specification, from memory) for one or two ports: S in real and imaginary parts, Hz, one
/// reference for all ports (that of the first, 50 ohm when the sweep has none). A point without an impedance is left out.
/// `comment` lines are written behind "!".
void write_touchstone(std::ostream& out, const Sweep& sweep, const std::string& comment);

}  // namespace coilassay

// Writes impedance matrices against frequency as Touchstone files that the reader reads back.
#pragma once

#include <iosfwd>
#include <string>

#include "acquire/capture.h"

namespace coilassay {

/// Touchstone 1.1 (open IBIS file specification, from memory) for any number of ports: Z in real and imaginary parts, Hz,
/// reference 1 ohm, so that the numbers are ohms; two ports in the order 11 21 12 22, more row by row with at most four pairs
/// on a line. `comment` lines are written behind "!".
void write_touchstone_impedance(std::ostream& out, const Sweep& sweep, const std::string& comment);

}  // namespace coilassay

// Units and prefixes as people type them; for number_text only.
#pragma once

#include <optional>
#include <string>
#include <string_view>

#include "base/unit.h"

namespace coilassay {

/// What a typed unit means: the number in front times factor times ten to the exponent is SI.
struct UnitText {
  Unit unit = Unit::one;
  int exponent = 0;        // kept apart from the number, so that 10nF becomes exactly the double 1e-8
  double factor = 1;       // for units that are no power of ten: minutes, degrees
  bool percent = false;    // %, ppm: of the value when it stands in a tolerance
};

/// The power of ten of a prefix; micro is 'u' here. K is taken as kilo.
std::optional<int> prefix_exponent(char prefix);

/// Prefix and unit without blanks ("nF", "kohm", "degC", "%"), 'u' for micro. A prefix alone takes the expected unit
/// (not for plain numbers and temperatures); what can be read as the expected unit is ("m" is metre for a length, milli
/// for a voltage; "K" is kelvin for a temperature difference, else kilo). std::nullopt when it means nothing.
std::optional<UnitText> understand_unit(std::string_view text, Unit expected);

/// Typed text brought to plain ASCII: µ and μ to u, Ω to ohm, ° to deg, the minus sign to -, the blanks of typographers
/// to ordinary ones, ± +- +/- to `kPlusMinus`. std::nullopt when a character remains that no value contains.
std::optional<std::string> plain_ascii(std::string_view text);
inline constexpr char kPlusMinus = '\x01';

}  // namespace coilassay

// The closed list of units the program speaks. Values are SI without prefix everywhere but in text for people.
#pragma once

#include <string_view>

namespace coilassay {

enum class Unit {
  one,
  volt,
  ampere,
  ohm,
  siemens,
  henry,
  farad,
  hertz,
  second,
  per_second,
  radian,
  weber,
  joule,
  watt,
  degree_celsius,
  kelvin,
  ampere_per_volt,
  tesla,
  metre,
};

/// ASCII symbol used in files and JSON: "H", "ohm", "Hz", "1/s", "degC", "1".
std::string_view symbol(Unit unit);

/// Symbol for people, UTF-8: as symbol(), but "Ω" and "°C"; empty for Unit::one.
std::string_view display_symbol(Unit unit);

/// The kind of quantity in words, for messages: "an inductance (H)", "a capacitance (F)".
std::string_view kind_in_words(Unit unit);

}  // namespace coilassay

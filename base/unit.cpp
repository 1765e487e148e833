#include "base/unit.h"

namespace coilassay {

namespace {

struct UnitWords {
  std::string_view symbol, display, kind;
};

UnitWords words(Unit unit) {
  switch (unit) {
    case Unit::one: return {"1", "", "a plain number"};
    case Unit::volt: return {"V", "V", "a voltage (V)"};
    case Unit::ampere: return {"A", "A", "a current (A)"};
    case Unit::ohm: return {"ohm", "Ω", "a resistance (ohm)"};
    case Unit::siemens: return {"S", "S", "a conductance (S)"};
    case Unit::henry: return {"H", "H", "an inductance (H)"};
    case Unit::farad: return {"F", "F", "a capacitance (F)"};
    case Unit::hertz: return {"Hz", "Hz", "a frequency (Hz)"};
    case Unit::second: return {"s", "s", "a time (s)"};
    case Unit::per_second: return {"1/s", "1/s", "a rate (1/s)"};
    case Unit::radian: return {"rad", "rad", "an angle (rad)"};
    case Unit::weber: return {"Wb", "Wb", "a flux (Wb)"};
    case Unit::joule: return {"J", "J", "an energy (J)"};
    case Unit::watt: return {"W", "W", "a power (W)"};
    case Unit::degree_celsius: return {"degC", "°C", "a temperature (degC)"};
    case Unit::kelvin: return {"K", "K", "a temperature difference (K)"};
    case Unit::ampere_per_volt: return {"A/V", "A/V", "a current per voltage (A/V)"};
    case Unit::tesla: return {"T", "T", "a flux density (T)"};
    case Unit::metre: return {"m", "m", "a length (m)"};
  }
  return {"1", "", "a plain number"};
}

}  // namespace

std::string_view symbol(Unit unit) { return words(unit).symbol; }
std::string_view display_symbol(Unit unit) { return words(unit).display; }
std::string_view kind_in_words(Unit unit) { return words(unit).kind; }

}  // namespace coilassay

#include "analysis/symbols.h"

#include <array>

namespace coilassay {

namespace {

constexpr std::array kSymbols = {
    Symbol{"f", Unit::hertz, "frequency"},
    Symbol{"Z", Unit::ohm, "impedance"},
    Symbol{"phi", Unit::radian, "phase"},
    Symbol{"R_s", Unit::ohm, "series resistance"},
    Symbol{"X_s", Unit::ohm, "series reactance"},
    Symbol{"L_s", Unit::henry, "series inductance"},
    Symbol{"R_p", Unit::ohm, "parallel resistance"},
    Symbol{"L_p", Unit::henry, "parallel inductance"},
    Symbol{"Q", Unit::one, "quality factor"},
    Symbol{"D", Unit::one, "dissipation factor"},
    Symbol{"L", Unit::henry, "inductance"},
    Symbol{"C_par", Unit::farad, "parallel capacitance"},
    Symbol{"R_par", Unit::ohm, "parallel loss resistance"},
    Symbol{"R_dc", Unit::ohm, "winding resistance"},
    Symbol{"R_dc_20", Unit::ohm, "winding resistance at 20 degC"},
    Symbol{"T_winding", Unit::degree_celsius, "winding temperature"},
    Symbol{"T_rise", Unit::kelvin, "rise over the air"},
    Symbol{"R_ac", Unit::ohm, "AC resistance"},
    Symbol{"f_0", Unit::hertz, "natural frequency"},
    Symbol{"f_d", Unit::hertz, "damped frequency"},
    Symbol{"alpha", Unit::per_second, "decay rate"},
    Symbol{"Q_coil", Unit::one, "quality factor of the coil"},
    Symbol{"L_0", Unit::henry, "inductance at zero current"},
    Symbol{"I_sat_10", Unit::ampere, "current at 10 % drop"},
    Symbol{"I_sat_20", Unit::ampere, "current at 20 % drop"},
    Symbol{"I_sat_30", Unit::ampere, "current at 30 % drop"},
    Symbol{"I_sat_10_secant", Unit::ampere, "current at 10 % drop (secant)"},
    Symbol{"I_sat_20_secant", Unit::ampere, "current at 20 % drop (secant)"},
    Symbol{"I_sat_30_secant", Unit::ampere, "current at 30 % drop (secant)"},
    Symbol{"E_max", Unit::joule, "stored energy at peak current"},
    Symbol{"W_loop", Unit::joule, "loss per cycle"},
    Symbol{"P", Unit::watt, "real power"},
    Symbol{"P_winding", Unit::watt, "winding loss"},
    Symbol{"f_r", Unit::hertz, "self-resonance"},
    Symbol{"skew", Unit::second, "delay of the current channel"},
    Symbol{"L_1", Unit::henry, "primary inductance"},
    Symbol{"L_2", Unit::henry, "secondary inductance"},
    Symbol{"M", Unit::henry, "mutual inductance"},
    Symbol{"k", Unit::one, "coupling factor"},
    Symbol{"n", Unit::one, "ratio sqrt(L_1/L_2)"},
    Symbol{"one_minus_k", Unit::one, "1 - k"},
    Symbol{"k_over_n", Unit::one, "open ratio secondary/primary, k/n"},
    Symbol{"k_times_n", Unit::one, "open ratio primary/secondary, k n"},
    Symbol{"L_leak_1", Unit::henry, "leakage seen from the primary"},
    Symbol{"L_leak_2", Unit::henry, "leakage seen from the secondary"},
};

}  // namespace

std::span<const Symbol> symbols() { return kSymbols; }

const Symbol* find_symbol(std::string_view symbol) {
  for (const Symbol& known : kSymbols) {
    if (known.symbol == symbol) return &known;
  }
  return nullptr;
}

}  // namespace coilassay

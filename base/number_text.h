// Numbers as people write and read them.
#pragma once

#include <optional>
#include <string>
#include <string_view>

#include "base/quantity.h"
#include "base/result.h"

namespace coilassay {

/// How text for people is written: UTF-8 (µ, Ω, ±) or plain ASCII (u, ohm, +/-).
enum class Script { utf8, ascii };

/// Reads a value the way people type it.
///
/// Value: "10nF", "10 nF", "4n7" and "4n7F" (IEC 60062; "4R7", "0R1", "R47"), "47u", "1 kΩ", "0.1ohm", "2.2e-9 F".
/// Prefixes f p n u µ m k M G T; K is taken as kilo, except for a temperature difference, where it is kelvin. "1meg" is refused
/// as ambiguous. A bare number is taken in the SI unit (from 10 mF and 1 H on it is refused: a forgotten prefix is likelier);
/// for plain numbers % and ppm are units, deg is one for angles, min, h and d for times.
/// Tolerance: "10nF±1%", "10nF+-0.1nF", "10nF±0.1" (rectangular half-width, in the unit of the value when it has none),
/// "23 ± 2 degC" (the unit holds for both), "±0%" exact, "10.012nF±5pF(k=2)" (normal, divided by k), "10.0120(25)nF"
/// (standard uncertainty in the last digits, normal). Percent is of the value; ppm likewise; both are refused for zero,
/// for degC, and for a value that itself is a percentage.
/// A decimal comma, a unit of another kind, nan, inf, overflow and a negative tolerance are refused.
///
/// @param place     for the error: "--capacitor" or "bench.toml:7"
/// @param expected  the unit the value must have
/// @return value in SI without prefix; bad_number, wrong_unit, or ambiguous (two readings with different numbers).
Result<StatedValue> parse_value(std::string_view text, Unit expected, std::string_view place);

/// Reads a bare decimal number in SI, nothing else ("1.5e-3", "+2"); the whole text must be used and the number finite.
/// std::nullopt if it is not one.
std::optional<double> parse_plain_number(std::string_view text);

// Texts for people. The prefix follows the rounded value (999.96 becomes 1.000 k) or, where that is larger, its
// uncertainty; plain numbers, temperatures and rates have none and are written with a power of ten when very large or
// small ("2.653(12)×10⁶ 1/s"). A NaN is "not known".

/// "47.02(28) µH": two digits of uncertainty (GUM notation). With no uncertainty known, or zero, `digits` significant
/// digits: "47.020 µH". An uncertainty larger than the value stays readable: "0.3(12) µH".
std::string to_text(const Quantity& q, Script script = Script::utf8, int digits = 5);

/// "47.02 µH ± 0.46 µH" with two digits of the half-width, for an expanded uncertainty.
std::string to_text_expanded(double value, double half_width, Unit unit, Script script = Script::utf8);

/// "232.1 kHz": engineering prefix, so many significant digits.
std::string to_text(double value, Unit unit, Script script = Script::utf8, int digits = 4);

/// "1.2 %", "310 ppm": a ratio for people, two digits or whole ones ("314 ppm"); ppm below 0.1 %, words above 1000 %.
std::string to_percent_text(double ratio, Script script = Script::utf8);

/// The shortest decimal text that reads back to the same double ("0.1", "2e-08"); nan and inf are a programming mistake.
std::string to_shortest(double value);

}  // namespace coilassay

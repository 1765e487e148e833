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
/// Value: "10nF", "10 nF", "4n7" and "4n7F" (IEC 60062), "1 kΩ", "0.1ohm", "2.2e-9 F", "1meg" is refused as ambiguous.
/// Tolerance: "10nF±1%" or "10nF+-0.1nF" (rectangular half-width), "±0%" exact, "10.012nF±5pF(k=2)" (normal, divided
/// by k), "10.0120(25)nF" (standard uncertainty in the last digits, normal). Percent is of the value; ppm likewise.
/// A bare number is taken in the SI unit. A decimal comma, a unit of another kind, nan, inf and overflow are refused.
///
/// @param place     for the error: "--capacitor" or "bench.toml:7"
/// @param expected  the unit the value must have
/// @return value in SI without prefix; bad_number or wrong_unit.
Result<StatedValue> parse_value(std::string_view text, Unit expected, std::string_view place);

/// Reads a bare decimal number in SI, nothing else ("1.5e-3"); the whole text must be used. std::nullopt if it is not one.
std::optional<double> parse_plain_number(std::string_view text);

/// "47.02(28) µH": engineering prefix by the value, two digits of uncertainty (GUM notation). With no uncertainty known,
/// `digits` significant digits: "47.02 µH". An uncertainty larger than the value stays readable: "0.3(12) µH".
std::string to_text(const Quantity& q, Script script = Script::utf8, int digits = 5);

/// "47.02 µH ± 0.46 µH" with the digits of the half-width, for an expanded uncertainty.
std::string to_text_expanded(double value, double half_width, Unit unit, Script script = Script::utf8);

/// "232.1 kHz": engineering prefix, so many significant digits.
std::string to_text(double value, Unit unit, Script script = Script::utf8, int digits = 4);

/// "1.2 %", "310 ppm": a ratio for people.
std::string to_percent_text(double ratio, Script script = Script::utf8);

/// The shortest decimal text that reads back to the same double ("0.1", "2e-08"); nan and inf are a programming mistake.
std::string to_shortest(double value);

}  // namespace coilassay

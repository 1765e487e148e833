#include "base/unit_text.h"

#include <utf8.h>

#include <array>
#include <numbers>

namespace coilassay {
namespace {

struct Spelling {
  std::string_view text;
  Unit unit;
  bool takes_prefix = true;
  int exponent = 0;
  double factor = 1;
  bool percent = false;
};

constexpr auto kSpellings = std::to_array<Spelling>({
    {"V", Unit::volt},
    {"volt", Unit::volt},
    {"volts", Unit::volt},
    {"A", Unit::ampere},
    {"amp", Unit::ampere},
    {"ampere", Unit::ampere},
    {"amperes", Unit::ampere},
    {"ohm", Unit::ohm},
    {"ohms", Unit::ohm},
    {"Ohm", Unit::ohm},
    {"Ohms", Unit::ohm},
    {"OHM", Unit::ohm},
    {"R", Unit::ohm},
    {"V/A", Unit::ohm},
    {"S", Unit::siemens},
    {"siemens", Unit::siemens},
    {"H", Unit::henry},
    {"henry", Unit::henry},
    {"F", Unit::farad},
    {"farad", Unit::farad},
    {"Hz", Unit::hertz},
    {"HZ", Unit::hertz},
    {"hz", Unit::hertz},
    {"s", Unit::second},
    {"sec", Unit::second},
    {"min", Unit::second, false, 0, 60},
    {"h", Unit::second, false, 0, 3600},
    {"d", Unit::second, false, 0, 86400},
    {"1/s", Unit::per_second, false},
    {"/s", Unit::per_second},
    {"s^-1", Unit::per_second, false},
    {"s-1", Unit::per_second, false},
    {"1/ms", Unit::per_second, false, 3},
    {"/ms", Unit::per_second, false, 3},
    {"1/us", Unit::per_second, false, 6},
    {"/us", Unit::per_second, false, 6},
    {"rad", Unit::radian},
    {"deg", Unit::radian, false, 0, std::numbers::pi / 180},
    {"Wb", Unit::weber},
    {"Vs", Unit::weber},
    {"J", Unit::joule},
    {"W", Unit::watt},
    {"degC", Unit::degree_celsius, false},
    {"C", Unit::degree_celsius, false},
    {"K", Unit::kelvin},
    {"A/V", Unit::ampere_per_volt},
    {"A/mV", Unit::ampere_per_volt, true, 3},
    {"T", Unit::tesla},
    {"m", Unit::metre},
    {"cm", Unit::metre, false, -2},
    {"%", Unit::one, false, -2, 1, true},
    {"ppm", Unit::one, false, -6, 1, true},
    {"x", Unit::one, false},
    {"V/V", Unit::one, false},
    {"A/A", Unit::one, false},
});

std::optional<UnitText> as_spelling(const Spelling& spelling, std::string_view text) {
  UnitText meaning{spelling.unit, spelling.exponent, spelling.factor, spelling.percent};
  if (text == spelling.text) return meaning;
  if (!spelling.takes_prefix || text.size() != spelling.text.size() + 1 || text.substr(1) != spelling.text) {
    return std::nullopt;
  }
  // mhz: is it milli or mega? Nobody who writes hz in small letters can be trusted with the m.
  if (spelling.unit == Unit::hertz && spelling.text != "Hz" && text.front() == 'm') return std::nullopt;
  const std::optional<int> exponent = prefix_exponent(text.front());
  if (!exponent) return std::nullopt;
  meaning.exponent += *exponent;
  return meaning;
}

}  // namespace

std::optional<int> prefix_exponent(char prefix) {
  switch (prefix) {
    case 'f': return -15;
    case 'p': return -12;
    case 'n': return -9;
    case 'u': return -6;
    case 'm': return -3;
    case 'k':
    case 'K': return 3;
    case 'M': return 6;
    case 'G': return 9;
    case 'T': return 12;
    default: return std::nullopt;
  }
}

std::optional<UnitText> understand_unit(std::string_view text, Unit expected) {
  for (const Spelling& spelling : kSpellings) {
    if (spelling.unit != expected) continue;
    if (const auto meaning = as_spelling(spelling, text)) return meaning;
  }
  // A difference of temperatures is the same in kelvin and in degrees Celsius; a temperature is not.
  if (expected == Unit::kelvin && (text == "degC" || text == "C")) return UnitText{Unit::kelvin};
  if (text.size() == 1 && expected != Unit::one && expected != Unit::degree_celsius) {
    if (const auto exponent = prefix_exponent(text.front())) return UnitText{expected, *exponent};
  }
  for (const Spelling& spelling : kSpellings) {
    if (const auto meaning = as_spelling(spelling, text)) return meaning;
  }
  return std::nullopt;
}

std::optional<std::string> plain_ascii(std::string_view text) {
  if (utf8::find_invalid(text.begin(), text.end()) != text.end()) return std::nullopt;
  std::string plain;
  const char* at = text.data();
  const char* const end = at + text.size();
  while (at != end) {
    switch (const auto c = static_cast<char32_t>(utf8::unchecked::next(at))) {
      case U'µ':        // U+00B5, the micro sign
      case U'\u03bc':   // Greek mu
        plain += 'u';
        break;
      case U'\u03a9':   // Greek omega
      case U'\u2126':   // ohm sign
        plain += "ohm";
        break;
      case U'°': plain += "deg"; break;
      case U'\u2103': plain += "degC"; break;
      case U'\u2212': plain += '-'; break;
      case U'×': plain += 'x'; break;
      case U'±': plain += kPlusMinus; break;
      case U'\t':
      case U'\u00a0':  // no-break
      case U'\u2007':  // as wide as a figure
      case U'\u2008':  // as wide as a full stop
      case U'\u2009':  // thin
      case U'\u200a':  // hair
      case U'\u202f':  // narrow no-break
        plain += ' ';
        break;
      default:
        if (c < 0x20 || c > 0x7e) return std::nullopt;
        plain += static_cast<char>(c);
    }
  }
  for (const std::string_view typed : {"+/-", "+-"}) {
    for (std::size_t p = plain.find(typed); p != std::string::npos; p = plain.find(typed, p)) {
      plain.replace(p, typed.size(), 1, kPlusMinus);
    }
  }
  return plain;
}

}  // namespace coilassay

// Writing: numbers are rounded once, by fmt, to a whole number of some decimal place; the rest is moving the point.
#include <fmt/format.h>

#include <algorithm>
#include <cassert>
#include <charconv>
#include <cmath>

#include "base/number_text.h"

namespace coilassay {
namespace {

/// digits * 10^place, without sign; zero is "0".
struct Rounded {
  std::string digits = "0";
  int place = 0;

  /// Power of ten of the leading digit.
  int magnitude() const { return static_cast<int>(digits.size()) - 1 + place; }
};

/// So many significant digits, rounded correctly.
Rounded to_digits(double value, int count) {
  assert(count >= 1 && std::isfinite(value));
  const std::string text = fmt::format("{:.{}e}", std::abs(value), count - 1);
  const std::size_t e = text.find('e');
  Rounded r;
  r.digits = text.substr(0, e);
  std::erase(r.digits, '.');
  int exponent = 0;
  const char* begin = text.data() + e + 1;
  if (*begin == '+') ++begin;
  std::from_chars(begin, text.data() + text.size(), exponent);
  r.place = exponent - (count - 1);
  return r;
}

/// Rounded to the given decimal place; "0" when nothing is left.
Rounded to_place(double value, int place) {
  if (value == 0) return {.digits = "0", .place = place};
  // 17 digits tell the magnitude unless the value is a hair below a power of ten, and then it rounds to that anyway.
  const int count = to_digits(value, 17).magnitude() - place + 1;
  if (count < 1) {
    const bool up = count == 0 && to_digits(value, 17).digits > "50000000000000000";  // a tie goes to the even 0
    return {.digits = up ? "1" : "0", .place = place};
  }
  Rounded r = to_digits(value, count);
  while (r.place > place) {  // rounding carried into a new digit
    r.digits += '0';
    --r.place;
  }
  return r;
}

/// The digits with the point where it belongs when the unit is 10^power.
std::string with_point(const Rounded& r, int power) {
  if (r.digits == "0" && r.place >= power) return "0";
  const int decimals = power - r.place;
  std::string text = r.digits;
  if (decimals <= 0) return text.append(static_cast<std::size_t>(-decimals), '0');
  const auto behind = static_cast<std::size_t>(decimals);
  if (text.size() <= behind) text.insert(0, behind + 1 - text.size(), '0');
  return text.insert(text.size() - behind, 1, '.');
}

bool takes_prefix(Unit unit) {
  return unit != Unit::one && unit != Unit::degree_celsius && unit != Unit::per_second && unit != Unit::kelvin;
}

/// The power of ten a text is written in, and what stands behind its numbers.
struct Scale {
  int power = 0;
  std::string suffix;  // with its blank
};

std::string power_of_ten(int power, Script script) {
  if (script == Script::ascii) return fmt::format("e{}", power);
  static constexpr std::string_view kRaised[] = {"⁰", "¹", "²", "³", "⁴", "⁵", "⁶", "⁷", "⁸", "⁹"};
  std::string text = "×10";
  for (const char c : std::to_string(power)) text += c == '-' ? "⁻" : kRaised[c - '0'];
  return text;
}

Scale scale_for(int magnitude, Unit unit, Script script) {
  const std::string_view name = script == Script::utf8 ? display_symbol(unit) : unit == Unit::one ? "" : symbol(unit);
  const std::string blank = name.empty() ? "" : " ";
  const int power = 3 * static_cast<int>(std::floor(magnitude / 3.0));
  if (takes_prefix(unit)) {
    static constexpr std::string_view kPrefixes[] = {"f", "p", "n", "µ", "m", "", "k", "M", "G", "T"};
    if (power >= -15 && power <= 12) {
      std::string_view prefix = kPrefixes[power / 3 + 5];
      if (script == Script::ascii && power == -6) prefix = "u";
      return {power, fmt::format(" {}{}", prefix, name)};
    }
  } else if (magnitude >= -5 && magnitude < 7) {
    return {0, fmt::format("{}{}", blank, name)};
  }
  return {power, fmt::format("{}{}{}", power_of_ten(power, script), blank, name)};
}

std::string sign_of(double value, const Rounded& rounded) { return value < 0 && rounded.digits != "0" ? "-" : ""; }

std::string not_a_number(double value) { return std::isnan(value) ? "not known" : value > 0 ? "infinite" : "-infinite"; }

/// Value and width rounded to the second digit of the width.
struct Pair {
  Rounded value, width;
};

Pair round_together(double value, double width) {
  Pair pair{{}, to_digits(width, 2)};
  // A double has no more than 17 digits to show. A width below them is shown as one in the last place: never smaller.
  const int finest = value == 0 ? pair.width.place : to_digits(value, 17).place + 1;
  if (pair.width.place < finest) {
    pair.width = to_place(width, finest);
    if (pair.width.digits == "0") pair.width.digits = "1";
  }
  pair.value = to_place(value, pair.width.place);
  return pair;
}

bool is_width(double width) { return std::isfinite(width) && width > 0; }

int magnitude_of(const Pair& pair) {
  return pair.value.digits == "0" ? pair.width.magnitude() : std::max(pair.value.magnitude(), pair.width.magnitude());
}

}  // namespace

std::string to_text(double value, Unit unit, Script script, int digits) {
  if (!std::isfinite(value)) return not_a_number(value);
  if (value == 0) return "0" + scale_for(0, unit, script).suffix;
  const Rounded rounded = to_digits(value, std::clamp(digits, 1, 17));
  const Scale scale = scale_for(rounded.magnitude(), unit, script);
  return sign_of(value, rounded) + with_point(rounded, scale.power) + scale.suffix;
}

std::string to_text(const Quantity& q, Script script, int digits) {
  if (!std::isfinite(q.value) || !is_width(q.standard_uncertainty)) return to_text(q.value, q.unit, script, digits);
  const Pair pair = round_together(q.value, q.standard_uncertainty);
  const Scale scale = scale_for(magnitude_of(pair), q.unit, script);
  // Digits in parentheses count in the last place of the value; where that is left of the point, in whole units.
  std::string in_parentheses = pair.width.digits;
  if (pair.width.place > scale.power) in_parentheses = with_point(pair.width, scale.power);
  return fmt::format("{}{}({}){}", sign_of(q.value, pair.value), with_point(pair.value, scale.power), in_parentheses,
                     scale.suffix);
}

std::string to_text_expanded(double value, double half_width, Unit unit, Script script) {
  if (!std::isfinite(value) || !is_width(half_width)) return to_text(value, unit, script);
  const Pair pair = round_together(value, half_width);
  const Scale scale = scale_for(magnitude_of(pair), unit, script);
  return fmt::format("{}{}{} {} {}{}", sign_of(value, pair.value), with_point(pair.value, scale.power), scale.suffix,
                     script == Script::utf8 ? "±" : "+/-", with_point(pair.width, scale.power), scale.suffix);
}

std::string to_percent_text(double ratio, Script script) {
  if (!std::isfinite(ratio)) return not_a_number(ratio);
  if (ratio == 0) return "0 %";
  // Beyond that the figure says nothing but that it is absurd.
  if (std::fabs(ratio) > 10) return ratio > 0 ? "more than 1000 %" : "less than -1000 %";
  Rounded rounded = to_digits(ratio, 2);
  const bool percent = rounded.magnitude() >= -3;
  const int power = percent ? -2 : -6;
  if (rounded.place > power) rounded = to_place(ratio, power);  // 123 %, not 120 %
  if (rounded.magnitude() < -9 || rounded.magnitude() > 4) {
    return fmt::format("{}{} %", sign_of(ratio, rounded),
                       with_point(rounded, rounded.magnitude()) + power_of_ten(rounded.magnitude() + 2, script));
  }
  return fmt::format("{}{} {}", sign_of(ratio, rounded), with_point(rounded, power), percent ? "%" : "ppm");
}

std::string to_shortest(double value) {
  assert(std::isfinite(value));
  return fmt::format("{}", value);
}

}  // namespace coilassay

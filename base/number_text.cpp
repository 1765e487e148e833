// Reading: one pass from the left, no backtracking. The decimal text with the prefix as its exponent goes to
// std::from_chars once, so that 10nF and 1e-8 are the same double.
#include "base/number_text.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>

#include "base/outside_text.h"
#include "base/unit_text.h"

namespace coilassay {
namespace {

/// A number as it stands in the text, not yet a double.
struct Decimal {
  std::string digits;      // sign, digits and at most one point
  int exponent = 0;
  int decimals = 0;        // digits behind the point
  std::string uncertainty;  // what stood in parentheses: digits, perhaps with a point
};

/// One side of the ±: a number and the unit behind it.
struct Term {
  Decimal number;
  std::string unit;  // as typed, without blanks; empty when there was none
};

bool is_digit(char c) { return c >= '0' && c <= '9'; }
bool is_letter(char c) { return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z'); }

std::string_view trimmed(std::string_view text) {
  const std::size_t begin = text.find_first_not_of(' ');
  if (begin == std::string_view::npos) return {};
  return text.substr(begin, text.find_last_not_of(' ') - begin + 1);
}

std::string without_blanks(std::string_view text) {
  std::string kept(text);
  std::erase(kept, ' ');
  return kept;
}

/// The nearest double of the decimal number times ten to the exponent; std::nullopt when it is out of range.
std::optional<double> to_double(std::string_view digits, int exponent) {
  if (!digits.empty() && digits.front() == '+') digits.remove_prefix(1);
  const std::string text = fmt::format("{}e{}", digits, exponent);
  double value = 0;
  const auto [end, problem] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (problem != std::errc() || end != text.data() + text.size() || !std::isfinite(value)) return std::nullopt;
  return value;
}

class ValueReader {
 public:
  ValueReader(std::string_view typed, Unit expected, std::string_view place)
      : typed_(typed), expected_(expected), place_(place) {}

  Result<StatedValue> read() {
    if (typed_.size() > 200) return bad("the value is longer than any value needs to be", example());
    const auto plain = plain_ascii(typed_);
    if (!plain) return bad(fmt::format("'{}' has a character that no value contains", text()), example());
    if (trimmed(*plain).empty()) return bad("there is no value", example());
    if (plain->find(',') != std::string::npos) {
      return bad(fmt::format("'{}' has a comma", text()), "write the decimal point, 4.7 for 4,7, and no thousands separator");
    }

    std::string_view rest = trimmed(*plain);
    std::optional<double> coverage;
    if (auto k = take_coverage(rest); !k) {
      return failure(k);
    } else {
      coverage = *k;
    }
    const std::size_t at = rest.find(kPlusMinus);
    const std::string_view left = trimmed(rest.substr(0, at));
    const bool has_tolerance = at != std::string_view::npos;
    const std::string_view right = has_tolerance ? trimmed(rest.substr(at + 1)) : std::string_view{};
    if (right.find(kPlusMinus) != std::string_view::npos) {
      return bad(fmt::format("'{}' has more than one ±", text()), example());
    }
    if (coverage && !has_tolerance) {
      return bad(fmt::format("'{}' states k, but no ± that it belongs to", text()), example());
    }

    auto value = take_term(left, "value");
    if (!value) return failure(value);
    if (!has_tolerance) return value_alone(*value);
    if (!value->number.uncertainty.empty()) {
      return bad(fmt::format("'{}' has an uncertainty in parentheses and a ± as well", text()), "state one of them");
    }
    if (right.empty()) return bad(fmt::format("'{}' has nothing behind the ±", text()), example());
    auto tolerance = take_term(right, "tolerance");
    if (!tolerance) return failure(tolerance);
    return value_with_tolerance(*value, *tolerance, coverage);
  }

 private:
  std::string text() const { return shown(typed_, 60); }

  tl::unexpected<Error> bad(std::string finding, std::string remedy) const {
    return failure(Problem::bad_number, std::string(place_), std::move(finding), std::move(remedy));
  }

  tl::unexpected<Error> ambiguous(std::string finding, std::string remedy) const {
    return failure(Problem::ambiguous, std::string(place_), std::move(finding), std::move(remedy));
  }

  std::string example() const {
    switch (expected_) {
      case Unit::one: return "write a number such as 10, 0.5 % or 1 ± 2 %";
      case Unit::ohm: return "write a value such as 0.1 ohm, 4k7 or 0.1 ohm ± 1 %";
      case Unit::henry: return "write a value such as 47 uH, 2.2e-6 H or 47 uH ± 2 %";
      case Unit::farad: return "write a value such as 10 nF, 4n7 or 10 nF ± 1 %";
      case Unit::hertz: return "write a value such as 100 kHz, 1e5 Hz or 100 kHz ± 25 ppm";
      case Unit::second: return "write a value such as 4 ns, 2e-6 s or 4 ns ± 1 ns";
      case Unit::per_second: return "write a rate such as 2650 1/s or 2650 1/s ± 2 %";
      case Unit::radian: return "write an angle such as 0.1 rad or 5 deg";
      case Unit::degree_celsius: return "write a temperature such as 23 degC or 23 ± 2 degC";
      case Unit::kelvin: return "write a difference such as 3 K or 3 ± 1 K";
      case Unit::ampere_per_volt: return "write a factor such as 10 A/V or 10 A/V ± 2 %";
      default: return fmt::format("write a value such as 4.7 {0}, 10 m{0} or 10 m{0} ± 2 %", symbol(expected_));
    }
  }

  /// Takes "(k=2)" off the end.
  Result<std::optional<double>> take_coverage(std::string_view& rest) const {
    if (rest.empty() || rest.back() != ')') return std::nullopt;
    const std::size_t open = rest.rfind('(');
    if (open == std::string_view::npos) return std::nullopt;
    const std::string inside = without_blanks(rest.substr(open + 1, rest.size() - open - 2));
    if (!inside.starts_with("k=") && !inside.starts_with("K=")) return std::nullopt;
    const auto k = parse_plain_number(std::string_view(inside).substr(2));
    if (!k || !(*k > 0)) {
      return bad(fmt::format("'{}' has a coverage factor that is no positive number", text()), "write it as (k=2)");
    }
    rest = trimmed(rest.substr(0, open));
    return *k;
  }

  Result<Term> take_term(std::string_view rest, std::string_view what) const {
    if (rest.empty()) return bad(fmt::format("'{}' has no {}", text(), what), example());
    Term term;
    Decimal& number = term.number;
    const bool has_digits = take_digits(rest, number);
    if (begins_letter_code(rest, number)) return take_letter_code(rest, std::move(term), has_digits);
    if (!has_digits) {
      return bad(fmt::format("'{}' is not a number", rest.empty() ? text() : shown(rest, 60)), example());
    }
    if (auto taken = take_uncertainty(rest, number); !taken) return failure(taken);
    take_exponent(rest, number);
    if (!rest.empty() && rest.front() == '.') return bad(fmt::format("'{}' has two decimal points", text()), example());
    term.unit = without_blanks(rest);
    if (!term.unit.empty() && is_digit(term.unit.front()) && !term.unit.starts_with("1/")) {
      return bad(fmt::format("'{}' has a blank inside a number", text()), "write the number without blanks");
    }
    return term;
  }

  /// Sign, digits and one point; false when there was no digit.
  static bool take_digits(std::string_view& rest, Decimal& number) {
    if (rest.front() == '+' || rest.front() == '-') {
      number.digits += rest.front();
      rest.remove_prefix(1);
    }
    bool any = false, point = false;
    while (!rest.empty() && (is_digit(rest.front()) || (rest.front() == '.' && !point))) {
      if (rest.front() == '.') {
        point = true;
      } else {
        any = true;
        if (point) ++number.decimals;
      }
      number.digits += rest.front();
      rest.remove_prefix(1);
    }
    return any;
  }

  /// IEC 60062: a letter stands for the point, 4n7, 0R1, R47.
  static bool begins_letter_code(std::string_view rest, const Decimal& number) {
    return number.digits.find('.') == std::string::npos && rest.size() >= 2 && is_digit(rest[1]) &&
           (rest[0] == 'R' || prefix_exponent(rest[0]));
  }

  Result<Term> take_letter_code(std::string_view rest, Term term, bool has_digits) const {
    const char letter = rest.front();
    if (letter == 'R' && expected_ != Unit::ohm) return wrong_kind(Unit::ohm);
    rest.remove_prefix(1);
    term.number.digits += has_digits ? "." : "0.";
    for (; !rest.empty() && is_digit(rest.front()); rest.remove_prefix(1)) {
      term.number.digits += rest.front();
      ++term.number.decimals;
    }
    const std::string behind = without_blanks(rest);
    if (!behind.empty() && !is_letter(behind.front())) return no_unit(behind);
    // The R is the unit as well; "4R7ohm" says it twice and that is fine.
    term.unit = letter == 'R' ? (behind.empty() ? "R" : behind) : std::string(1, letter) + behind;
    return term;
  }

  Result<void> take_uncertainty(std::string_view& rest, Decimal& number) const {
    if (rest.empty() || rest.front() != '(') return {};
    const std::size_t close = rest.find(')');
    const std::string inside(close == std::string_view::npos ? "" : rest.substr(1, close - 1));
    const bool has_digits = inside.find_first_of("0123456789") != std::string::npos;
    if (!has_digits || inside.find_first_not_of("0123456789.") != std::string::npos ||
        std::count(inside.begin(), inside.end(), '.') > 1) {
      return bad(fmt::format("'{}' has parentheses that hold no digits", text()),
                 "write the uncertainty of the last digits, 10.0120(25) nF, or 10 nF ± 5 pF (k=2)");
    }
    number.uncertainty = inside;
    rest.remove_prefix(close + 1);
    return {};
  }

  /// "e-9"; an e without digits behind it is left to the unit.
  static void take_exponent(std::string_view& rest, Decimal& number) {
    if (rest.size() < 2 || (rest.front() != 'e' && rest.front() != 'E')) return;
    const std::size_t begin = rest[1] == '+' || rest[1] == '-' ? 2 : 1;
    const std::size_t end = std::min(rest.find_first_not_of("0123456789", begin), rest.size());
    if (end == begin) return;
    const std::string_view digits = rest.substr(begin, end - begin);
    int exponent = 999999;  // more than six digits are beyond any double; the range check says so
    if (digits.size() <= 6) std::from_chars(digits.data(), digits.data() + digits.size(), exponent);
    number.exponent = rest[1] == '-' ? -exponent : exponent;
    rest.remove_prefix(end);
  }

  tl::unexpected<Error> wrong_kind(Unit kind) const {
    return failure(Problem::wrong_unit, std::string(place_),
                   fmt::format("'{}' is {}, where {} is needed", text(), kind_in_words(kind), kind_in_words(expected_)),
                   example());
  }

  tl::unexpected<Error> no_unit(std::string_view unit) const {
    std::string lower(unit);
    std::transform(lower.begin(), lower.end(), lower.begin(),
                   [](char c) { return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c; });
    if (lower.starts_with("meg")) {
      return ambiguous(fmt::format("'{}' is ambiguous: meg is read as mega by some and m as milli or mega by others", text()),
                       "write M for mega, 1M, or m for milli, 1m");
    }
    if (unit.ends_with("V/A") && expected_ == Unit::ampere_per_volt) {
      return bad(fmt::format("'{}' is voltage per current, where {} is needed", text(), kind_in_words(expected_)),
                 "write the inverse, 10 A/V for 100 mV/A");
    }
    if (expected_ == Unit::one && unit.size() == 1 && prefix_exponent(unit.front())) {
      return bad(fmt::format("'{}' has a prefix, but a plain number is needed", text()), "write 0.005 or 0.5 %");
    }
    return failure(Problem::wrong_unit, std::string(place_),
                   fmt::format("'{}' in '{}' is no unit known here; {} is needed", shown(unit, 20), text(),
                               kind_in_words(expected_)),
                   example() + "; small and capital letters matter");
  }

  /// The unit of a term, which must be of the expected kind.
  Result<UnitText> unit_of(const std::string& unit, Unit expected) const {
    if (unit.empty()) return UnitText{expected};
    const auto meaning = understand_unit(unit, expected);
    if (!meaning) return no_unit(unit);
    if (meaning->unit != expected) {
      if (unit.ends_with("V/A")) return no_unit(unit);
      return wrong_kind(meaning->unit);
    }
    return *meaning;
  }

  /// "K" or "mK" where a temperature is expected: fit for its tolerance, not for itself.
  bool is_difference_of_temperatures(std::string_view unit) const {
    return expected_ == Unit::degree_celsius && unit.ends_with('K') && understand_unit(unit, Unit::kelvin);
  }

  Result<double> in_si(const Decimal& number, const UnitText& unit) const {
    const auto value = to_double(number.digits, number.exponent + unit.exponent);
    if (!value || !std::isfinite(*value * unit.factor)) {
      return bad(fmt::format("'{}' is beyond the range of numbers", text()), example());
    }
    return *value * unit.factor;
  }

  /// "10" for a capacitor was hardly meant as 10 F: a farad or a henry, and more, is taken only when the unit says so.
  Result<void> plausible(const std::string& unit, double value) const {
    const bool large = expected_ == Unit::farad ? std::fabs(value) >= 0.01
                                                : expected_ == Unit::henry && std::fabs(value) >= 1;
    if (!unit.empty() || !large) return {};
    return ambiguous(fmt::format("'{}' has no unit and would be {} {}, hardly what was meant", text(), value, symbol(expected_)),
                     fmt::format("write the unit, {0}n{1}, {0}u{1} or, if it is meant, {0}{1}", value, symbol(expected_)));
  }

  Result<StatedValue> value_alone(const Term& term) const {
    const auto unit = unit_of(term.unit, expected_);
    if (!unit) return failure(unit);
    const auto value = in_si(term.number, *unit);
    if (!value) return failure(value);
    if (const auto meant = plausible(term.unit, *value); !meant) return failure(meant);
    if (term.number.uncertainty.empty()) return StatedValue::unstated(*value, expected_);

    // Digits without a point count in the last place of the value.
    Decimal u;
    u.digits = term.number.uncertainty;
    u.exponent = term.number.exponent;
    if (u.digits.find('.') == std::string::npos) u.exponent -= term.number.decimals;
    const auto standard = in_si(u, *unit);
    if (!standard) return failure(standard);
    return *standard == 0 ? StatedValue::exact(*value, expected_) : StatedValue::normal(*value, *standard, expected_);
  }

  Result<StatedValue> value_with_tolerance(const Term& left, const Term& right, std::optional<double> coverage) const {
    if (!right.number.uncertainty.empty()) {
      return bad(fmt::format("'{}' has parentheses in its tolerance", text()), example());
    }
    const auto share = understand_unit(right.unit, Unit::one);
    const bool relative = !right.unit.empty() && share && share->percent;
    // "23 ± 2 degC": the unit behind the tolerance holds for both. "10 nF ± 0.1": so does that before it.
    const std::string& left_unit = left.unit.empty() && !relative ? right.unit : left.unit;
    const std::string& right_unit = right.unit.empty() ? left.unit : right.unit;

    auto unit = unit_of(left_unit, expected_);
    if (left.unit.empty() && is_difference_of_temperatures(right.unit)) {
      unit = UnitText{expected_};  // "23 ± 2 K": the bare value is in degC
    }
    if (!unit) return failure(unit);
    const auto value = in_si(left.number, *unit);
    if (!value) return failure(value);
    if (const auto meant = plausible(left_unit, *value); !meant) return failure(meant);

    double half_width = 0;
    if (relative) {
      if (unit->percent) {
        return ambiguous(fmt::format("'{}' can mean percent of the value or percentage points", text()),
                         "write both as plain numbers, 0.05 ± 0.01");
      }
      if (expected_ == Unit::degree_celsius) {
        return bad(fmt::format("'{}' has a percentage of a temperature in degC, which means nothing", text()),
                   "write 23 ± 2 degC");
      }
      const auto ratio = in_si(right.number, *share);
      if (!ratio) return failure(ratio);
      if (*value == 0 && *ratio != 0) {
        return bad(fmt::format("'{}' has a percentage of zero", text()),
                   fmt::format("state the tolerance in {}", symbol(expected_)));
      }
      half_width = *ratio * std::abs(*value);
    } else {
      // A tolerance of a temperature is a difference.
      auto tolerance_unit = unit_of(right_unit, expected_);
      if (is_difference_of_temperatures(right_unit)) tolerance_unit = unit_of(right_unit, Unit::kelvin);
      if (!tolerance_unit) return failure(tolerance_unit);
      const auto width = in_si(right.number, *tolerance_unit);
      if (!width) return failure(width);
      half_width = *width;
    }
    if (std::signbit(half_width) || right.number.digits.front() == '-') {
      return bad(fmt::format("'{}' has a negative tolerance", text()), example());
    }
    if (!std::isfinite(half_width)) return bad(fmt::format("'{}' is beyond the range of numbers", text()), example());
    if (half_width == 0) return StatedValue::exact(*value, expected_);
    if (coverage) return StatedValue::normal(*value, half_width / *coverage, expected_);
    return StatedValue::rectangular(*value, half_width, expected_);
  }

  std::string_view typed_;
  Unit expected_;
  std::string_view place_;
};

}  // namespace

Result<StatedValue> parse_value(std::string_view text, Unit expected, std::string_view place) {
  return ValueReader(text, expected, place).read();
}

std::optional<double> parse_plain_number(std::string_view text) {
  // from_chars knows no plus sign, but takes inf and nan, which are no measured values.
  if (text.starts_with('+')) {
    text.remove_prefix(1);
    if (text.starts_with('-')) return std::nullopt;
  }
  if (text.empty() || !(is_digit(text.front()) || text.front() == '-' || text.front() == '.')) return std::nullopt;
  double value = 0;
  const auto [end, problem] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (problem != std::errc() || end != text.data() + text.size() || !std::isfinite(value)) return std::nullopt;
  return value;
}

}  // namespace coilassay

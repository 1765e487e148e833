#include "acquire/number_scan.h"

#include <algorithm>
#include <charconv>
#include <cmath>
#include <string>
#include <system_error>

namespace coilassay {
namespace {

using number_scan_detail::digit;

bool blank(char c) { return c == ' ' || c == '\t' || c == '\r'; }

std::string_view trimmed(std::string_view text) {
  while (!text.empty() && blank(text.front())) text.remove_prefix(1);
  while (!text.empty() && blank(text.back())) text.remove_suffix(1);
  return text;
}

char lower(char c) { return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c; }

bool all_of(std::string_view text, char c) {
  return !text.empty() && text.find_first_not_of(c) == std::string_view::npos;
}

/// Words for "no number here"; compared in lower case without sign.
CellKind word_kind(std::string_view cell) {
  if (cell.empty() || all_of(cell, '-')) return CellKind::missing;
  if (all_of(cell, '*')) return CellKind::over_range;
  if (cell.front() == '-' || cell.front() == '+') cell.remove_prefix(1);
  if (cell.size() > 12) return CellKind::text;
  std::string word(cell);
  std::transform(word.begin(), word.end(), word.begin(), lower);
  for (const char* missing : {"nan", "na", "n/a", "#n/a", "null", "none", "nan(ind)", "1.#qnan", "1.#ind", "?"}) {
    if (word == missing) return CellKind::missing;
  }
  for (const char* over : {"inf", "infinity", "\xE2\x88\x9E", "ol", "o.l", "o.l.", "0l", "0.l", "overload", "over", "overrange",
                           "over-range", "overflow", "ovld", "ovrng", "1.#inf"}) {
    if (word == over) return CellKind::over_range;
  }
  return CellKind::text;
}

/// A decimal number, nothing else, into the form from_chars reads; empty when it is not one.
struct Written {
  std::string digits;  // sign, digits, at most one '.'
  int exponent = 0;
};

/// Exponents beyond this mean zero or infinity whatever the digits are (a cell has at most a few hundred of them).
constexpr int kExponentLimit = 100000;

/// "u" of "10u"; after a blank too.
bool take_prefix(std::string_view text, int& exponent) {
  text = trimmed(text);
  if (text == "\xC2\xB5" || text == "\xCE\xBC" || text == "\xB5") text = "u";  // micro sign, Greek mu, both encodings
  if (text.size() != 1) return false;
  switch (text.front()) {
    case 'f': exponent = -15; return true;
    case 'p': exponent = -12; return true;
    case 'n': exponent = -9; return true;
    case 'u': exponent = -6; return true;
    case 'm': exponent = -3; return true;
    case 'k': case 'K': exponent = 3; return true;
    case 'M': exponent = 6; return true;
    case 'G': exponent = 9; return true;
    case 'T': exponent = 12; return true;
    default: return false;
  }
}

/// The blank between thousands at the start of text: ordinary, non-breaking (UTF-8 and Windows-1252), thin, narrow; 0 if none.
std::size_t blank_of_thousands(std::string_view text) {
  for (const std::string_view sign : {" ", "\xC2\xA0", "\xE2\x80\x89", "\xE2\x80\xAF", "\xA0"}) {
    if (text.starts_with(sign)) return sign.size();
  }
  return 0;
}

/// Whether three digits and no fourth follow.
bool three_digits(std::string_view text) {
  return text.size() >= 3 && digit(text[0]) && digit(text[1]) && digit(text[2]) && (text.size() == 3 || !digit(text[3]));
}

bool take_exponent(std::string_view text, int& exponent) {
  if (text.empty()) return true;
  if (lower(text.front()) != 'e') return take_prefix(text, exponent);
  text.remove_prefix(1);
  const bool down = text.starts_with('-');
  if (down || text.starts_with('+')) text.remove_prefix(1);
  if (text.empty()) return false;
  int value = 0;
  for (const char c : text) {
    if (!digit(c)) return false;
    value = std::min(value * 10 + (c - '0'), kExponentLimit);
  }
  exponent = down ? -value : value;
  return true;
}

bool take_number(std::string_view cell, char decimal, Written& written) {
  constexpr std::string_view kMinus = "\xE2\x88\x92";  // the sign typographers use
  if (cell.starts_with('-') || cell.starts_with(kMinus)) written.digits += '-';
  if (cell.starts_with('-') || cell.starts_with('+')) {
    cell.remove_prefix(1);
  } else if (cell.starts_with(kMinus)) {
    cell.remove_prefix(kMinus.size());
  }
  bool any = false;
  bool point = false;
  std::size_t since_blank = 0;  // digits of the whole number since the last blank
  std::size_t i = 0;
  while (i < cell.size()) {
    if (digit(cell[i])) {
      any = true;
      ++since_blank;
      written.digits += cell[i++];
    } else if (cell[i] == decimal && !point) {
      point = true;
      written.digits += '.';
      ++i;
    } else if (const std::size_t blanks = blank_of_thousands(cell.substr(i));
               blanks > 0 && !point && since_blank >= 1 && since_blank <= 3 && three_digits(cell.substr(i + blanks))) {
      since_blank = 0;
      i += blanks;
    } else {
      break;
    }
  }
  return any && take_exponent(cell.substr(i), written.exponent);
}

/// From here on instruments mean "not a number" or "infinite" (SCPI-99 volume 1, 7.2.1.4 and 7.2.1.5, from memory).
constexpr double kScpiInfinity = 9.9e37;

CellValue to_value(const Written& written, int shift) {
  const std::string text = written.digits + "e" + std::to_string(written.exponent + shift);
  double value = 0;
  const auto [end, problem] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (problem == std::errc::result_out_of_range) {
    // Too small for a double is zero; too large is more than any instrument shows.
    const std::size_t first = written.digits.find_first_of("123456789");
    const std::size_t point = std::min(written.digits.find('.'), written.digits.size());
    const auto magnitude = static_cast<std::ptrdiff_t>(point) - static_cast<std::ptrdiff_t>(first);
    const bool small = first == std::string::npos || magnitude + written.exponent + shift < 0;
    if (small) return {CellKind::number, written.digits.starts_with('-') ? -0.0 : 0.0};
    return {CellKind::over_range, std::nan("")};
  }
  if (problem != std::errc() || end != text.data() + text.size()) return {CellKind::text, std::nan("")};
  if (std::fabs(value) >= kScpiInfinity * std::pow(10.0, shift)) return {CellKind::over_range, std::nan("")};
  return {CellKind::number, value};
}

/// Long numbers in their plain form, the usual reason why the quick scan gave up.
bool read_long(std::string_view cell, double& value) {
  const bool plus = cell.starts_with('+');  // from_chars knows a minus only
  if (plus) cell.remove_prefix(1);
  const std::size_t sign = !plus && cell.starts_with('-') ? 1 : 0;
  if (cell.size() <= sign || !(digit(cell[sign]) || cell[sign] == '.')) return false;  // it takes inf and nan, which are none here
  const auto [end, problem] = std::from_chars(cell.data(), cell.data() + cell.size(), value);
  return problem == std::errc() && end == cell.data() + cell.size() && std::fabs(value) < kScpiInfinity;
}

}  // namespace

CellValue read_cell(std::string_view cell, char decimal, int shift) {
  cell = trimmed(cell);
  if (cell.size() >= 2 && (cell.front() == '"' || cell.front() == '\'') && cell.back() == cell.front()) {
    cell = trimmed(cell.substr(1, cell.size() - 2));
  }
  double value = 0;
  if (decimal == '.' && shift == 0 && read_long(cell, value)) return {CellKind::number, value};
  Written written;
  if (take_number(cell, decimal, written)) return to_value(written, shift);
  return {word_kind(cell), std::nan("")};
}

WrittenDigits written_digits(std::string_view cell, char decimal) {
  cell = trimmed(cell);
  WrittenDigits found;
  bool point = false;
  int decimals = 0;
  std::size_t i = 0;
  for (; i < cell.size(); ++i) {
    const char c = cell[i];
    if (c == decimal) {
      point = true;
    } else if (digit(c)) {
      if (c != '0' || found.significant > 0) ++found.significant;
      if (point) ++decimals;
    } else if (c != '+' && c != '-' && c != '"') {
      break;
    }
  }
  int exponent = 0;
  std::string_view tail = cell.substr(i);
  while (!tail.empty() && tail.back() == '"') tail.remove_suffix(1);
  take_exponent(tail, exponent);
  found.last_place = exponent - decimals;
  return found;
}

}  // namespace coilassay

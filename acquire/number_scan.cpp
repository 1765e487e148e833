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

bool take_exponent(std::string_view text, int& exponent) {
  if (text.empty()) return true;
  if (lower(text.front()) != 'e') return false;
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
  if (cell.starts_with('-')) written.digits += '-';
  if (cell.starts_with('-') || cell.starts_with('+')) cell.remove_prefix(1);
  bool any = false;
  bool point = false;
  std::size_t i = 0;
  for (; i < cell.size(); ++i) {
    if (digit(cell[i])) {
      any = true;
      written.digits += cell[i];
    } else if (cell[i] == decimal && !point) {
      point = true;
      written.digits += '.';
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

}  // namespace

CellValue read_cell(std::string_view cell, char decimal, int shift) {
  cell = trimmed(cell);
  if (cell.size() >= 2 && (cell.front() == '"' || cell.front() == '\'') && cell.back() == cell.front()) {
    cell = trimmed(cell.substr(1, cell.size() - 2));
  }
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

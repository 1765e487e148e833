// Numbers of a table, from text to the nearest double.
#pragma once

#include <array>
#include <cstdint>
#include <cstring>
#include <string_view>

namespace coilassay {

/// What a cell of a table holds.
enum class CellKind : unsigned char {
  number,
  missing,     // empty, nan, dashes
  over_range,  // inf, OL, asterisks, 9.9E37: the instrument saw more than it can show
  text,
};

struct CellValue {
  CellKind kind = CellKind::text;
  double value = 0;  // NaN unless it is a number
};

/// Reads a whole cell: blanks around it, quotes, a sign, a decimal number with or without exponent, or one of the words
/// instruments write where there is no number. Correctly rounded, as strtod. A prefix may follow ("10u", "35m", "1M":
/// case matters), and blanks of any width may part the thousands of the whole number ("1 234.5").
///
/// @param decimal  '.' or ','
/// @param shift    power of ten by which the number is multiplied before it is rounded (-3 for a column in mV)
CellValue read_cell(std::string_view cell, char decimal, int shift = 0);

/// Position of the last digit written: "1.250" is -3, "12e3" is 3; for a cell that is a number. Tells how far a stamp
/// may have been rounded. Digits counts those from the first that is not zero.
struct WrittenDigits {
  int last_place = 0;
  int significant = 0;
};
WrittenDigits written_digits(std::string_view cell, char decimal);

namespace number_scan_detail {

inline constexpr std::array<double, 23> kPowersOfTen = {1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,  1e7,
                                                        1e8,  1e9,  1e10, 1e11, 1e12, 1e13, 1e14, 1e15,
                                                        1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22};

inline bool digit(char c) { return static_cast<unsigned char>(c - '0') < 10; }
inline std::uint64_t digit_value(char c) { return static_cast<std::uint64_t>(c - '0'); }

/// Whether the eight bytes at p are digits; if so their value. Eight at a time in one register: pairs, fours, eights.
[[gnu::always_inline]] inline bool eight_digits(const char* p, std::uint64_t& value) {
  std::uint64_t v = 0;
  std::memcpy(&v, p, 8);
  if (((v & 0xF0F0F0F0F0F0F0F0U) | (((v + 0x0606060606060606U) & 0xF0F0F0F0F0F0F0F0U) >> 4U)) != 0x3333333333333333U) {
    return false;
  }
  v -= 0x3030303030303030U;
  v = v * 10 + (v >> 8U);
  value = (((v & 0x000000FF000000FFU) * 0x000F424000000064U) +
           (((v >> 16U) & 0x000000FF000000FFU) * 0x0000271000000001U)) >> 32U;
  return true;
}

}  // namespace number_scan_detail

/// The common case, at the start of a cell: sign, at most 19 digits, exponent. Exact because both the digits (at most
/// 2^53) and the power of ten (at most 10^22) are doubles without error, so that one multiplication or division rounds
/// once (W. D. Clinger, "How to read floating point numbers accurately", PLDI 1990, from memory, checked against strtod).
///
/// Reads at most 32 bytes beyond the number: the caller's buffer is padded.
/// @return the first byte behind the number, or nullptr when read_cell must look at the cell.
template <char decimal>
[[gnu::always_inline]] inline const char* scan_number(const char* p, int shift, double& value) {
  using namespace number_scan_detail;
  const bool negative = *p == '-';
  p += (negative || *p == '+') ? 1 : 0;
  std::uint64_t digits = 0;
  const char* const first = p;
  while (digit(*p)) digits = digits * 10 + digit_value(*p++);
  std::ptrdiff_t count = p - first;
  std::ptrdiff_t exponent = shift;
  if (*p == decimal) {
    const char* const fraction = ++p;
    std::uint64_t eight = 0;
    if (eight_digits(p, eight)) {
      digits = digits * 100000000U + eight;
      p += 8;
      if (eight_digits(p, eight)) {
        digits = digits * 100000000U + eight;
        p += 8;
      }
    }
    while (digit(*p)) digits = digits * 10 + digit_value(*p++);
    count += p - fraction;
    exponent -= p - fraction;
  }
  // More than 19 digits may have overflowed.
  if (count == 0 || count > 19 || digits > (std::uint64_t{1} << 53U)) return nullptr;
  if (*p == 'e' || *p == 'E') {
    ++p;
    const bool down = *p == '-';
    p += (down || *p == '+') ? 1 : 0;
    if (!digit(*p)) return nullptr;
    std::ptrdiff_t written = *p++ - '0';
    if (digit(*p)) written = written * 10 + (*p++ - '0');
    if (digit(*p)) return nullptr;
    exponent += down ? -written : written;
  }
  double result = static_cast<double>(digits);
  if (exponent < 0) {
    if (exponent < -22) return nullptr;
    result /= kPowersOfTen[static_cast<std::size_t>(-exponent)];
  } else {
    if (exponent > 22) return nullptr;
    result *= kPowersOfTen[static_cast<std::size_t>(exponent)];
  }
  value = negative ? -result : result;
  return p;
}

}  // namespace coilassay

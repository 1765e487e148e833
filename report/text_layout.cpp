#include "report/text_layout.h"

#include <fmt/format.h>
#include <utf8.h>

#include <algorithm>
#include <array>

namespace coilassay {

namespace {

std::size_t width_of(char32_t c) {
  if (c >= 0x300 && c <= 0x36f) return 0;
  const bool wide = (c >= 0x1100 && c <= 0x115f) || (c >= 0x2e80 && c <= 0xa4cf) || (c >= 0xac00 && c <= 0xd7a3) ||
                    (c >= 0xf900 && c <= 0xfaff) || (c >= 0xfe30 && c <= 0xfe6f) || (c >= 0xff00 && c <= 0xff60) ||
                    (c >= 0x1f300 && c <= 0x1faff) || (c >= 0x20000 && c <= 0x3fffd);
  return wide ? 2 : 1;
}

/// Takes the next character off; a byte that is no UTF-8 counts as U+FFFD, as terminals show it.
char32_t take(std::string_view& text) {
  const char* at = text.data();
  try {
    const char32_t c = utf8::next(at, text.data() + text.size());
    text.remove_prefix(static_cast<std::size_t>(at - text.data()));
    return c;
  } catch (const utf8::exception&) {
    text.remove_prefix(1);
    return 0xfffd;
  }
}

struct Spelling {
  char32_t c;
  std::string_view ascii;
};
constexpr std::array kSpellings = {
    Spelling{0xb5, "u"},      Spelling{0x3bc, "u"},      Spelling{0x3a9, "ohm"},    Spelling{0x2126, "ohm"},
    Spelling{0xb1, "+/-"},    Spelling{0xb0, "deg"},     Spelling{0x2013, "-"},     Spelling{0x2014, "-"},
    Spelling{0x2212, "-"},    Spelling{0x2026, "..."},   Spelling{0xb2, "^2"},      Spelling{0xb3, "^3"},
    Spelling{0xd7, "x"},      Spelling{0xb7, "*"},       Spelling{0x221a, "sqrt"},  Spelling{0x3c0, "pi"},
    Spelling{0x3c4, "tau"},   Spelling{0x3c9, "omega"},  Spelling{0x3b1, "alpha"},  Spelling{0x3c6, "phi"},
    Spelling{0x3c3, "sigma"}, Spelling{0x3bb, "lambda"}, Spelling{0x394, "delta "}, Spelling{0x2264, "<="},
    Spelling{0x2265, ">="},   Spelling{0x2248, "~"},     Spelling{0x2018, "'"},     Spelling{0x2019, "'"},
    Spelling{0x201c, "\""},   Spelling{0x201d, "\""},    Spelling{0xa0, " "},       Spelling{0x202f, " "},
    Spelling{0x2009, " "},    Spelling{0x2192, "->"},    Spelling{0x2080, "_0"},
};

}  // namespace

std::size_t display_width(std::string_view text) {
  std::size_t width = 0;
  while (!text.empty()) width += width_of(take(text));
  return width;
}

std::string padded(std::string_view text, std::size_t width) {
  const std::size_t has = display_width(text);
  return std::string(text) + std::string(width > has ? width - has : 0, ' ');
}

std::string in_script(std::string_view text, Script script) {
  if (script == Script::utf8) return std::string(text);
  std::string result;
  while (!text.empty()) {
    const char32_t c = take(text);
    const auto* known = std::find_if(kSpellings.begin(), kSpellings.end(), [c](const Spelling& s) { return s.c == c; });
    if (c < 0x80) {
      result += static_cast<char>(c);
    } else if (known != kSpellings.end()) {
      result += known->ascii;
    } else {
      result += c > 0xffff ? fmt::format("\\U{:08x}", static_cast<std::uint32_t>(c))
                           : fmt::format("\\u{:04x}", static_cast<std::uint32_t>(c));
    }
  }
  return result;
}

std::string wrapped(std::string_view text, std::string_view first, std::size_t width) {
  const std::size_t indent = display_width(first);
  const std::size_t room = std::max<std::size_t>(width > indent ? width - indent : 0, 16);
  std::string result(first), line;
  std::size_t used = 0;
  bool any = false;
  const auto end_line = [&] {
    if (any) result += '\n' + std::string(indent, ' ');
    result += line;
    line.clear();
    used = 0;
    any = true;
  };
  while (!text.empty()) {
    std::string_view word = text.substr(0, text.find(' '));
    text.remove_prefix(std::min(text.size(), word.size() + 1));
    if (word.empty()) continue;
    const std::size_t wide = display_width(word);
    if (used > 0 && used + 1 + wide > room) end_line();
    if (used > 0) line += ' ', ++used;
    while (display_width(word) > room) {  // a path or a code: broken anywhere rather than beyond the edge
      std::string_view rest = word;
      while (used < room) used += width_of(take(rest));
      line += word.substr(0, word.size() - rest.size());
      word = rest;
      end_line();
    }
    line += word;
    used += display_width(word);
  }
  if (used > 0 || !any) end_line();
  return result + '\n';
}

std::string aligned(const std::vector<std::vector<std::string>>& rows, std::string_view indent) {
  std::vector<std::size_t> widths;
  for (const auto& row : rows) {
    if (row.size() > widths.size()) widths.resize(row.size(), 0);
    for (std::size_t i = 0; i < row.size(); ++i) widths[i] = std::max(widths[i], display_width(row[i]));
  }
  std::string result;
  for (const auto& row : rows) {
    std::string line(indent);
    for (std::size_t i = 0; i < row.size(); ++i) {
      if (widths[i] > 0) line += padded(row[i], widths[i] + 2);
    }
    line.erase(line.find_last_not_of(' ') + 1);
    result += line + '\n';
  }
  return result;
}

}  // namespace coilassay

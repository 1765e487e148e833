#include "base/outside_text.h"

#include <fmt/format.h>
#include <utf8.h>

#include <algorithm>
#include <cstdint>
#include <functional>
#include <vector>

#include "base/number_text.h"

namespace coilassay {
namespace {

constexpr std::string_view kEllipsis = "…";

/// Characters that steer a terminal, reorder a line, break it, or cannot be seen.
bool must_be_escaped(char32_t c) {
  if (c < 0x20 || (c >= 0x7f && c <= 0x9f)) return true;     // C0, DEL, C1
  if (c == 0x00ad || c == 0x061c || c == 0x180e) return true;  // soft hyphen, Arabic letter mark, Mongolian separator
  if (c >= 0x200b && c <= 0x200f) return true;               // zero width, left-to-right and right-to-left marks
  if (c >= 0x2028 && c <= 0x202e) return true;               // line and paragraph separators, embeddings, overrides
  if (c >= 0x2060 && c <= 0x206f) return true;               // word joiner, invisible operators, isolates
  if (c == 0xfeff || (c >= 0xfff9 && c <= 0xfffb)) return true;  // byte-order mark, annotations
  return c >= 0xe0000 && c <= 0xe0fff;                       // tags, supplementary variation selectors
}

std::string escaped(char32_t c) {
  const auto code = static_cast<std::uint32_t>(c);
  if (code < 0x80) return fmt::format("\\x{:02x}", code);
  return code <= 0xffff ? fmt::format("\\u{:04x}", code) : fmt::format("\\U{:08x}", code);
}

/// Calls take(code point) for each valid character and take_invalid(byte) for each byte that belongs to none; either
/// may return false to stop.
void for_each_character(std::string_view text, const std::function<bool(char32_t, std::string_view)>& take,
                        const std::function<bool(unsigned char)>& take_invalid) {
  const char* at = text.data();
  const char* const end = at + text.size();
  while (at != end) {
    const char* const valid_until = utf8::find_invalid(at, end);
    while (at != valid_until) {
      const char* const begin = at;
      const auto c = static_cast<char32_t>(utf8::unchecked::next(at));
      if (!take(c, std::string_view(begin, static_cast<std::size_t>(at - begin)))) return;
    }
    if (at == end) return;
    if (!take_invalid(static_cast<unsigned char>(*at))) return;
    ++at;
  }
}

}  // namespace

std::string shown(std::string_view outside, std::size_t limit) {
  // A character has at most four bytes: beyond this nothing can be shown anyway.
  if (outside.size() / 4 > limit + 1) outside = outside.substr(0, 4 * (limit + 2));

  std::string out;
  std::size_t characters = 0;          // written so far
  std::size_t cut = 0;                 // where to cut so that the ellipsis still fits
  bool too_long = false;
  const auto append = [&](std::string_view piece, std::size_t length) {
    if (characters + length > limit) {
      too_long = true;
      return false;
    }
    out += piece;
    characters += length;
    if (characters + 1 <= limit) cut = out.size();
    return true;
  };
  for_each_character(
      outside,
      [&](char32_t c, std::string_view bytes) {
        if (!must_be_escaped(c)) return append(bytes, 1);
        const std::string text = escaped(c);
        return append(text, text.size());
      },
      [&](unsigned char byte) { return append(fmt::format("\\x{:02x}", unsigned{byte}), 4); });
  if (too_long) {
    out.resize(cut);
    if (limit > 0) out += kEllipsis;
  }
  return out;
}

std::string csv_cell(std::string_view outside) {
  std::string cell;
  constexpr std::string_view kFormulaStarts = "=+-@\t\r";
  if (!outside.empty() && kFormulaStarts.find(outside.front()) != std::string_view::npos &&
      !parse_plain_number(outside)) {
    cell.push_back('\'');
  }
  cell += outside;
  const bool blank_at_an_end = !cell.empty() && (cell.front() == ' ' || cell.back() == ' ');
  if (!blank_at_an_end && cell.find_first_of(",;\"\t\r\n") == std::string::npos) return cell;
  std::string quoted(1, '"');
  for (const char c : cell) {
    if (c == '"') quoted += '"';
    quoted += c;
  }
  quoted += '"';
  return quoted;
}

std::string identifier(std::string_view outside) {
  constexpr std::size_t kLongest = 100;
  std::string name;
  const auto append = [&name](char c) {
    name += c;
    return name.size() < kLongest;
  };
  for_each_character(
      outside,
      [&](char32_t c, std::string_view) {
        const bool plain = (c >= U'a' && c <= U'z') || (c >= U'A' && c <= U'Z') || (c >= U'0' && c <= U'9');
        return append(plain ? static_cast<char>(c) : '_');
      },
      [&](unsigned char) { return append('_'); });
  if (name.empty() || (name.front() >= '0' && name.front() <= '9')) name = "_" + name;
  return name;
}

std::size_t edit_distance(std::string_view a, std::string_view b) {
  // Outside text can be of any length; words this long are never near.
  constexpr std::size_t kLongest = 256;
  if (a.size() > kLongest || b.size() > kLongest) return a == b ? 0 : std::max(a.size(), b.size());

  // Optimal string alignment: three rows of the usual table, the third for the swap of neighbours.
  std::vector<std::size_t> two_ago(b.size() + 1), previous(b.size() + 1), row(b.size() + 1);
  for (std::size_t j = 0; j <= b.size(); ++j) previous[j] = j;
  for (std::size_t i = 1; i <= a.size(); ++i) {
    row[0] = i;
    for (std::size_t j = 1; j <= b.size(); ++j) {
      const std::size_t replace = previous[j - 1] + (a[i - 1] == b[j - 1] ? 0 : 1);
      row[j] = std::min({previous[j] + 1, row[j - 1] + 1, replace});
      if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1]) row[j] = std::min(row[j], two_ago[j - 2] + 1);
    }
    std::swap(two_ago, previous);
    std::swap(previous, row);
  }
  return previous[b.size()];
}

}  // namespace coilassay

#include "app/commands/block_letters.h"

#include <array>

namespace coilassay {

namespace {

constexpr std::size_t kRows = 7, kColumns = 5;
using Glyph = std::array<std::string_view, kRows>;

struct Letter {
  char letter;
  Glyph rows;
};

// clang-format off
constexpr Letter kLetters[] = {
    {'A', {" ### ", "#   #", "#   #", "#####", "#   #", "#   #", "#   #"}},
    {'B', {"#### ", "#   #", "#   #", "#### ", "#   #", "#   #", "#### "}},
    {'C', {" ####", "#    ", "#    ", "#    ", "#    ", "#    ", " ####"}},
    {'D', {"#### ", "#   #", "#   #", "#   #", "#   #", "#   #", "#### "}},
    {'E', {"#####", "#    ", "#    ", "#### ", "#    ", "#    ", "#####"}},
    {'F', {"#####", "#    ", "#    ", "#### ", "#    ", "#    ", "#    "}},
    {'G', {" ####", "#    ", "#    ", "#  ##", "#   #", "#   #", " ####"}},
    {'H', {"#   #", "#   #", "#   #", "#####", "#   #", "#   #", "#   #"}},
    {'I', {"#####", "  #  ", "  #  ", "  #  ", "  #  ", "  #  ", "#####"}},
    {'J', {"    #", "    #", "    #", "    #", "#   #", "#   #", " ### "}},
    {'K', {"#   #", "#  # ", "# #  ", "##   ", "# #  ", "#  # ", "#   #"}},
    {'L', {"#    ", "#    ", "#    ", "#    ", "#    ", "#    ", "#####"}},
    {'M', {"#   #", "## ##", "# # #", "#   #", "#   #", "#   #", "#   #"}},
    {'N', {"#   #", "##  #", "# # #", "#  ##", "#   #", "#   #", "#   #"}},
    {'O', {" ### ", "#   #", "#   #", "#   #", "#   #", "#   #", " ### "}},
    {'P', {"#### ", "#   #", "#   #", "#### ", "#    ", "#    ", "#    "}},
    {'Q', {" ### ", "#   #", "#   #", "#   #", "# # #", "#  # ", " ## #"}},
    {'R', {"#### ", "#   #", "#   #", "#### ", "# #  ", "#  # ", "#   #"}},
    {'S', {" ####", "#    ", "#    ", " ### ", "    #", "    #", "#### "}},
    {'T', {"#####", "  #  ", "  #  ", "  #  ", "  #  ", "  #  ", "  #  "}},
    {'U', {"#   #", "#   #", "#   #", "#   #", "#   #", "#   #", " ### "}},
    {'V', {"#   #", "#   #", "#   #", "#   #", "#   #", " # # ", "  #  "}},
    {'W', {"#   #", "#   #", "#   #", "#   #", "# # #", "## ##", "#   #"}},
    {'X', {"#   #", "#   #", " # # ", "  #  ", " # # ", "#   #", "#   #"}},
    {'Y', {"#   #", "#   #", " # # ", "  #  ", "  #  ", "  #  ", "  #  "}},
    {'Z', {"#####", "    #", "   # ", "  #  ", " #   ", "#    ", "#####"}},
    {' ', {"     ", "     ", "     ", "     ", "     ", "     ", "     "}},
};
constexpr Glyph kTick     = {"       ", "      #", "     # ", "#   #  ", " # #   ", "  #    ", "       "};
constexpr Glyph kCross    = {"#     #", " #   # ", "  # #  ", "   #   ", "  # #  ", " #   # ", "#     #"};
constexpr Glyph kQuestion = {"  ###  ", " #   # ", "     # ", "   ##  ", "   #   ", "       ", "   #   "};
constexpr Glyph kBar      = {"       ", "       ", "       ", "#######", "       ", "       ", "       "};
// clang-format on

const Glyph& glyph_of(char letter) {
  for (const Letter& each : kLetters) {
    if (each.letter == letter) return each.rows;
  }
  return kLetters[std::size(kLetters) - 1].rows;
}

const Glyph* glyph_of(BlockSign sign) {
  switch (sign) {
    case BlockSign::tick: return &kTick;
    case BlockSign::cross: return &kCross;
    case BlockSign::question: return &kQuestion;
    case BlockSign::bar: return &kBar;
    case BlockSign::none: break;
  }
  return nullptr;
}

}  // namespace

std::vector<std::string> block_letters(BlockSign sign, std::string_view word, std::size_t width, Script script) {
  const Glyph* mark = glyph_of(sign);
  const std::size_t marked = mark != nullptr ? (*mark)[0].size() + 2 : 0;
  std::size_t scale = 2;
  if (scale * (marked + word.size() * (kColumns + 1)) > width) scale = 1;
  while (!word.empty() && scale * (marked + word.size() * (kColumns + 1)) > width) word.remove_suffix(1);
  const std::string_view block = script == Script::utf8 ? "█" : "#";
  std::vector<std::string> rows;
  for (std::size_t r = 0; r < kRows; ++r) {
    std::string pattern;
    if (mark != nullptr) pattern += std::string((*mark)[r]) + "  ";
    for (const char letter : word) pattern += std::string(glyph_of(letter)[r]) + " ";
    std::string row;
    for (const char dot : pattern) {
      for (std::size_t i = 0; i < scale; ++i) row += dot == '#' ? block : std::string_view(" ");
    }
    while (!row.empty() && row.back() == ' ') row.pop_back();
    rows.push_back(std::move(row));
  }
  return rows;
}

}  // namespace coilassay

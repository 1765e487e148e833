// Text for people on a terminal: how wide it is, where it breaks, and how it looks without UTF-8.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "base/number_text.h"

namespace coilassay {

/// Columns a UTF-8 text takes: combining marks none, East Asian wide characters two.
std::size_t display_width(std::string_view text);

/// The text followed by blanks up to `width` columns.
std::string padded(std::string_view text, std::size_t width);

/// Our own words and safe outside text in the script asked for: in ASCII "µ" becomes "u", "Ω" "ohm", "±" "+/-"; what
/// has no such form becomes an escape such as \u00e9.
std::string in_script(std::string_view text, Script script);

/// Breaks a text at blanks so that no line is wider than `width`: the first line begins with `first`, the others with
/// as many blanks as `first` has columns. A word that is too long for a line is broken where the line ends.
std::string wrapped(std::string_view text, std::string_view first, std::size_t width);

/// Columns side by side, two blanks between them, each as wide as its widest cell; no blanks at line ends.
std::string aligned(const std::vector<std::vector<std::string>>& rows, std::string_view indent);

}  // namespace coilassay

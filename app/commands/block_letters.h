// Words and signs in letters one sees from two metres: five columns and seven rows of blocks.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "base/number_text.h"

namespace coilassay {

/// The sign that stands beside a word, so that neither colour nor language is needed.
enum class BlockSign { tick, cross, question, bar, none };

/// Seven rows of a sign and a word of capital letters, blanks and digits; twice as wide when `width` columns allow it, else
/// single; a word that fits in neither way is cut. Other characters become blanks.
std::vector<std::string> block_letters(BlockSign sign, std::string_view word, std::size_t width, Script script);

}  // namespace coilassay

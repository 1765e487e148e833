// How every JSON document of the program is written.
#pragma once

#include <nlohmann/json_fwd.hpp>
#include <string>
#include <string_view>

namespace coilassay {

/// The document with two blanks of indentation and one line feed at the end. A list of plain values stands on one line.
/// Doubles are the shortest digits that read back to the same double, with ".0" after a whole number so that readers
/// which tell integers apart see a number of the same kind every time. NaN and inf become null: there is no such
/// number.
std::string json_text(const nlohmann::ordered_json& document);

/// Outside text as valid UTF-8 with everything that could trick a terminal or a page made visible.
std::string json_safe(std::string_view outside);

}  // namespace coilassay

// Lines and cells of the first stretch of a table, where the meaning is found; the bulk is read by table_block.
#pragma once

#include <cstddef>
#include <string>
#include <string_view>
#include <vector>

namespace coilassay {

struct TableLine {
  std::string_view text;   // without its end
  std::size_t number = 0;  // counted from 1
};

/// The lines of a stretch of text; a last line without end counts only when the text is complete.
std::vector<TableLine> lines_of(std::string_view text, bool complete);

/// A cell without the blanks and quotes around it.
std::string_view bare_cell(std::string_view cell);

/// The cells of a line, as they stand. A delimiter inside double quotes is text; a blank as delimiter stands for any run
/// of blanks and tabs.
std::vector<std::string_view> cells_of(std::string_view line, char delimiter);

/// Text for people and settings: bare, and in UTF-8 (bytes that are none are taken as Windows-1252).
std::string cell_text(std::string_view cell);

std::string lower_case(std::string_view text);  // ASCII letters only

}  // namespace coilassay

#include "acquire/table_cells.h"

#include <iconv.h>
#include <utf8cpp/utf8.h>

namespace coilassay {
namespace {

bool blank(char c) { return c == ' ' || c == '\t' || c == '\r'; }

std::string from_windows_1252(std::string_view text) {
  const iconv_t convert = ::iconv_open("UTF-8", "CP1252");
  if (convert == reinterpret_cast<iconv_t>(-1)) return std::string(text);
  std::string out;
  for (char c : text) {
    // Byte by byte: a byte that has no meaning there is kept, and shown escaped wherever it is shown.
    char* from = &c;
    std::size_t from_left = 1;
    char room[8];
    char* to = room;
    std::size_t to_left = sizeof room;
    if (::iconv(convert, &from, &from_left, &to, &to_left) == static_cast<std::size_t>(-1)) {
      ::iconv(convert, nullptr, nullptr, nullptr, nullptr);
      out += c;
    } else {
      out.append(room, sizeof room - to_left);
    }
  }
  ::iconv_close(convert);
  return out;
}

}  // namespace

std::vector<TableLine> lines_of(std::string_view text, bool complete) {
  std::vector<TableLine> lines;
  std::size_t number = 0;
  while (!text.empty()) {
    const std::size_t end = text.find('\n');
    if (end == std::string_view::npos && !complete) break;
    std::string_view line = text.substr(0, end);
    if (line.ends_with('\r')) line.remove_suffix(1);
    lines.push_back({line, ++number});
    if (end == std::string_view::npos) break;
    text.remove_prefix(end + 1);
  }
  return lines;
}

std::string_view bare_cell(std::string_view cell) {
  const auto trim = [&cell] {
    while (!cell.empty() && blank(cell.front())) cell.remove_prefix(1);
    while (!cell.empty() && blank(cell.back())) cell.remove_suffix(1);
  };
  trim();
  if (cell.size() >= 2 && cell.front() == '"' && cell.back() == '"') {
    cell = cell.substr(1, cell.size() - 2);
    trim();
  }
  return cell;
}

std::vector<std::string_view> cells_of(std::string_view line, char delimiter) {
  std::vector<std::string_view> cells;
  if (delimiter == ' ') {
    std::size_t at = 0;
    while (at < line.size()) {
      while (at < line.size() && blank(line[at])) ++at;
      const std::size_t begin = at;
      bool quoted = false;
      while (at < line.size() && (quoted || !blank(line[at]))) quoted ^= line[at++] == '"';
      if (at > begin) cells.push_back(line.substr(begin, at - begin));
    }
    return cells;
  }
  std::size_t begin = 0;
  bool quoted = false;
  for (std::size_t at = 0; at < line.size(); ++at) {
    if (line[at] == '"') quoted = !quoted;
    if (line[at] == delimiter && !quoted) {
      cells.push_back(line.substr(begin, at - begin));
      begin = at + 1;
    }
  }
  if (quoted) {  // a quote that never closes is no quote
    cells.clear();
    begin = 0;
    for (std::size_t at = line.find(delimiter); at != std::string_view::npos; at = line.find(delimiter, begin)) {
      cells.push_back(line.substr(begin, at - begin));
      begin = at + 1;
    }
  }
  cells.push_back(line.substr(begin));
  return cells;
}

std::string cell_text(std::string_view cell) {
  cell = bare_cell(cell);
  if (utf8::is_valid(cell.begin(), cell.end())) return std::string(cell);
  return from_windows_1252(cell);
}

std::string lower_case(std::string_view text) {
  std::string out(text);
  for (char& c : out) {
    if (c >= 'A' && c <= 'Z') c = static_cast<char>(c - 'A' + 'a');
  }
  return out;
}

}  // namespace coilassay

#include "acquire/table_paired.h"

#include <fmt/format.h>

#include <algorithm>
#include <optional>

#include "acquire/byte_source_lines.h"
#include "acquire/number_scan.h"
#include "acquire/table_cells.h"
#include "acquire/table_reader.h"

namespace coilassay {
namespace {

struct Pair {
  std::string_view first, second;
  bool polar = false;  // decibels and degrees; otherwise real and imaginary part
};

bool number(std::string_view cell) { return read_cell(cell, '.').kind == CellKind::number; }

/// Removes an ending, whichever of them is there.
bool take_ending(std::string_view& text, std::initializer_list<std::string_view> endings) {
  for (const std::string_view ending : endings) {
    if (!text.ends_with(ending)) continue;
    text.remove_suffix(ending.size());
    return true;
  }
  return false;
}

std::optional<Pair> pair_of(std::string_view cell) {
  cell = bare_cell(cell);
  const bool bracketed = cell.starts_with('(') && cell.ends_with(')');
  if (bracketed) cell = cell.substr(1, cell.size() - 2);
  const std::size_t comma = cell.find(',');
  if (comma == std::string_view::npos || cell.find(',', comma + 1) != std::string_view::npos) return std::nullopt;
  Pair pair{bare_cell(cell.substr(0, comma)), bare_cell(cell.substr(comma + 1)), false};
  pair.polar = take_ending(pair.first, {"dB", "DB", "db"});
  const bool degrees = take_ending(pair.second, {"\xC2\xB0", "\xB0", "deg"});
  if (pair.polar != degrees || !number(pair.first) || !number(pair.second)) return std::nullopt;
  return pair;
}

/// The line with its pairs as two cells each; nothing when it has none.
std::optional<std::string> split(std::string_view line) {
  std::string out;
  bool any = false;
  for (const std::string_view cell : cells_of(line, '\t')) {
    if (!out.empty()) out += '\t';
    if (const auto pair = pair_of(cell)) {
      any = true;
      out.append(pair->first).append("\t").append(pair->second);
    } else {
      out.append(cell);
    }
  }
  if (!any) return std::nullopt;
  return out;
}

/// "V(a)/I(L1)" above a pair becomes two headings.
std::string split_heading(std::string_view heading, std::string_view first_row) {
  const auto names = cells_of(heading, '\t');
  const auto cells = cells_of(first_row, '\t');
  std::string out;
  for (std::size_t c = 0; c < cells.size(); ++c) {
    if (c > 0) out += '\t';
    const std::string name = c < names.size() ? cell_text(names[c]) : "";
    const auto pair = pair_of(cells[c]);
    if (!pair) {
      out += name;
    } else if (pair->polar) {
      out += fmt::format("{} mag [dB]\t{} phase [deg]", name, name);
    } else {
      out += fmt::format("Re({})\tIm({})", name, name);
    }
  }
  return out;
}

class SplitBytes final : public ByteSource {
 public:
  explicit SplitBytes(ByteSource& inner) : inner_(inner), blocks_(inner) {}
  const std::string& name() const override { return inner_.name(); }
  std::size_t size_hint() const override { return 0; }
  void stop() override { inner_.stop(); }

  Result<std::size_t> read(std::span<char> into) override {
    std::size_t done = 0;
    while (done < into.size()) {
      if (at_ == text_.size()) {
        if (const auto more = split_more(); !more) return failure(more);
        if (text_.empty()) break;
      }
      const std::size_t count = std::min(into.size() - done, text_.size() - at_);
      std::copy_n(text_.begin() + static_cast<std::ptrdiff_t>(at_), count, into.begin() + static_cast<std::ptrdiff_t>(done));
      done += count;
      at_ += count;
    }
    return done;
  }

 private:
  Result<void> split_more() {
    text_.clear();
    at_ = 0;
    if (const auto got = blocks_.next(block_); !got) return got;
    const auto lines = lines_of(block_.text(), true);
    for (std::size_t i = 0; i < lines.size(); ++i) {
      const bool heading = !row_seen_ && i + 1 < lines.size() && split(lines[i + 1].text) && !split(lines[i].text);
      if (const auto row = split(lines[i].text)) {
        row_seen_ = true;
        text_ += *row;
      } else if (heading) {
        text_ += split_heading(lines[i].text, lines[i + 1].text);
      } else {
        text_ += lines[i].text;
      }
      text_ += '\n';
    }
    return {};
  }

  ByteSource& inner_;
  LineBlocks blocks_;
  LineBlock block_;
  std::string text_;
  std::size_t at_ = 0;
  bool row_seen_ = false;
};

class PairedTableReader final : public Reader {
 public:
  std::string_view format_name() const override { return "table"; }

  bool recognises(std::string_view, std::string_view first_bytes) const override {
    const auto lines = lines_of(first_bytes, false);
    return !lines.empty() && lines.back().text.find('\t') != std::string_view::npos && split(lines.back().text).has_value();
  }

  Result<Recording> read(ByteSource& bytes, std::string_view, const ReadOptions& options) const override {
    SplitBytes split_bytes(bytes);
    ReadOptions as_split = options;
    as_split.delimiter = '\t';
    as_split.decimal = '.';
    const auto table = table_reader();
    return table->read(split_bytes, {}, as_split);
  }
};

}  // namespace

std::unique_ptr<Reader> paired_table_reader() { return std::make_unique<PairedTableReader>(); }

}  // namespace coilassay

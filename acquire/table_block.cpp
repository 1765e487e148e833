#include "acquire/table_block.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstring>

#include "acquire/number_scan.h"
#include "acquire/table_cells.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

/// Reads rows with the signs of one dialect; `blanks` is for tables whose cells stand apart by blanks only.
template <char decimal, bool blanks>
class BlockReader {
 public:
  BlockReader(const LineBlock& block, std::size_t from, const TableLayout& layout, BlockColumns& into)
      : layout_(layout), into_(into), p_(block.bytes.data() + from), end_(block.bytes.data() + block.size) {}

  void read() {
    prepare();
    while (p_ < end_) {
      if (into_.rows == capacity_) grow();
      const char* const line = p_;
      if (read_row()) {
        ++into_.rows;
      } else {
        const auto* const line_end = static_cast<const char*>(std::memchr(line, '\n', static_cast<std::size_t>(end_ - line)));
        note_break(std::string_view(line, static_cast<std::size_t>(line_end - line)));
        p_ = line_end + 1;
        if (into_.breaks.size() == BlockColumns::kMostBreaks) return;
      }
      ++into_.lines;
    }
  }

 private:
  void prepare() {
    const std::size_t stored = layout_.stored();
    into_.values.resize(stored);
    into_.over_range.resize(stored);
    for (auto& rows : into_.over_range) rows.clear();
    into_.rows = into_.lines = 0;
    into_.breaks.clear();
    out_.resize(stored);
    capacity_ = into_.values.empty() ? 0 : into_.values.front().size();
    if (capacity_ == 0) grow();
    for (std::size_t c = 0; c < stored; ++c) out_[c] = into_.values[c].data();
  }

  void grow() {
    capacity_ = std::max<std::size_t>(2 * capacity_, 4096);
    for (std::size_t c = 0; c < into_.values.size(); ++c) {
      into_.values[c].resize(capacity_);
      out_[c] = into_.values[c].data();
    }
  }

  void pass_blanks() {
    if constexpr (blanks) {
      while (*p_ == ' ' || *p_ == '\t') ++p_;
    } else {
      while (*p_ == ' ') ++p_;
    }
  }

  bool at_cell_end() const {
    if constexpr (blanks) {
      return *p_ == ' ' || *p_ == '\t' || *p_ == '\n' || *p_ == '\r';
    } else {
      return *p_ == layout_.delimiter || *p_ == '\n' || *p_ == '\r';
    }
  }

  /// From the start of a cell to the sign behind it.
  std::string_view take_cell() {
    const char* const begin = p_;
    bool quoted = false;
    while (*p_ != '\n' && (quoted || !at_cell_end())) quoted ^= *p_++ == '"';
    return {begin, static_cast<std::size_t>(p_ - begin)};
  }

  bool read_row() {
    std::size_t out = 0;
    const std::size_t width = layout_.columns.size();
    for (std::size_t c = 0; c < width; ++c) {
      pass_blanks();
      const ColumnPlan& plan = layout_.columns[c];
      if constexpr (blanks) {
        if (*p_ == '\n' || *p_ == '\r') return false;
      }
      if (!plan.stored) {
        take_cell();
      } else {
        const char* const behind = scan_number<decimal>(p_, plan.shift, out_[out][into_.rows]);
        const char* const cell = p_;
        if (behind != nullptr) p_ = behind;
        if (behind == nullptr || !at_cell_end()) {
          p_ = cell;
          if (!read_odd_cell(plan, out)) return false;
        }
        ++out;
      }
      if (c + 1 < width && !pass_delimiter()) return false;
    }
    return pass_line_end();
  }

  bool read_odd_cell(const ColumnPlan& plan, std::size_t out) {
    const CellValue cell = read_cell(take_cell(), decimal, plan.shift);
    if (cell.kind == CellKind::text) return false;
    if (cell.kind == CellKind::over_range) over_range_.push_back(out);
    out_[out][into_.rows] = cell.value;
    return true;
  }

  bool pass_delimiter() {
    if constexpr (blanks) return true;
    if (*p_ != layout_.delimiter) return false;
    ++p_;
    return true;
  }

  /// The end of a row, perhaps behind one more delimiter.
  bool pass_line_end() {
    if constexpr (!blanks) {
      if (*p_ == layout_.delimiter) ++p_;
    }
    while (*p_ == ' ' || *p_ == '\t' || *p_ == '\r') ++p_;
    if (*p_ != '\n') return false;
    ++p_;
    if (!over_range_.empty()) keep_over_range();
    return true;
  }

  void keep_over_range() {
    for (const std::size_t out : over_range_) into_.over_range[out].push_back(static_cast<std::uint32_t>(into_.rows));
    over_range_.clear();
  }

  void note_break(std::string_view line) {
    constexpr std::size_t kShown = 200;
    over_range_.clear();
    if (line.ends_with('\r')) line.remove_suffix(1);
    const std::string_view bare = bare_cell(line);
    if (bare.empty()) return;
    const std::string_view start = bare.substr(0, kShown);
    if (bare.front() == '#' || bare.front() == '!' || bare.front() == '%') {
      into_.breaks.push_back({into_.rows, into_.lines, true, true, cell_text(bare_cell(start.substr(1))), {}});
      return;
    }
    into_.breaks.push_back({into_.rows, into_.lines, false, in_words(line), cell_text(start), finding(line)});
  }

  /// No cell with a number: not a row that was damaged.
  bool in_words(std::string_view line) const {
    const auto cells = cells_of(line, layout_.delimiter);
    return std::none_of(cells.begin(), cells.end(),
                        [](std::string_view cell) { return read_cell(cell, decimal).kind == CellKind::number; });
  }

  std::string finding(std::string_view line) const {
    const auto cells = cells_of(line, layout_.delimiter);
    const std::size_t width = layout_.columns.size();
    for (std::size_t c = 0; c < std::min(cells.size(), width); ++c) {
      if (layout_.columns[c].stored && read_cell(cells[c], decimal).kind == CellKind::text) {
        return fmt::format("'{}' in column {} is no number", shown(cell_text(cells[c]), 60), c + 1);
      }
    }
    return fmt::format("this row has {} cell{} where those before have {}", cells.size(), cells.size() == 1 ? "" : "s", width);
  }

  const TableLayout& layout_;
  BlockColumns& into_;
  const char* p_;
  const char* const end_;
  std::vector<double*> out_;
  std::vector<std::size_t> over_range_;  // of the row being read
  std::size_t capacity_ = 0;
};

}  // namespace

std::size_t TableLayout::stored() const {
  return static_cast<std::size_t>(
      std::count_if(columns.begin(), columns.end(), [](const ColumnPlan& plan) { return plan.stored; }));
}

void read_block(const LineBlock& block, std::size_t from, const TableLayout& layout, BlockColumns& into) {
  const bool blanks = layout.delimiter == ' ';
  if (layout.decimal == ',') {
    blanks ? BlockReader<',', true>(block, from, layout, into).read()
           : BlockReader<',', false>(block, from, layout, into).read();
  } else {
    blanks ? BlockReader<'.', true>(block, from, layout, into).read()
           : BlockReader<'.', false>(block, from, layout, into).read();
  }
}

}  // namespace coilassay

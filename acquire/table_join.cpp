#include "acquire/table_join.h"

#include <fmt/format.h>

#include <algorithm>

#include "acquire/table_cells.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

bool starts_with_word(std::string_view text, std::string_view word) {
  if (!text.starts_with(word)) return false;
  if (text.size() == word.size()) return true;
  const char next = text[word.size()];
  return next < 'a' || next > 'z';
}

bool is_end_mark(std::string_view line) {
  const std::string text = lower_case(bare_cell(line));
  for (const std::string_view word : {"end", "[end", "<end", "eof", "</data"}) {
    if (starts_with_word(text, word)) return true;
  }
  return false;
}

/// What follows the whole number, digits all alike: "-1.25e-06" is ".99e+99", "35m" is "m".
std::string shape(std::string_view number, char decimal) {
  std::string out;
  for (const char c : bare_cell(number)) {
    const bool digit = c >= '0' && c <= '9';
    const bool letter = (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z');
    if (c == decimal || letter || !out.empty()) out += digit ? '9' : c == '-' ? '+' : c;
  }
  return out;
}

const TableBreak* first_hard(const std::vector<TableBreak>& breaks) {
  const auto hard = std::find_if(breaks.begin(), breaks.end(), [](const TableBreak& b) { return !b.comment; });
  return hard == breaks.end() ? nullptr : &*hard;
}

}  // namespace

bool introduces_record(std::string_view line) {
  const std::string text = lower_case(bare_cell(line));
  for (const std::string_view word : {"step information", "step", "run", "segment", "record", "frame", "sweep", "acquisition",
                                      "waveform", "begin", "[begin", "<begin", "data", "[data", "<data"}) {
    if (starts_with_word(text, word)) return true;
  }
  return false;
}

bool last_number_cut(std::string_view tail, char delimiter, char decimal) {
  const auto lines = lines_of(tail, true);
  constexpr std::size_t kCompared = 5;
  if (lines.size() < kCompared + 2) return false;  // the first may be cut off by the look itself
  const auto last_cells = cells_of(lines.back().text, delimiter);
  if (last_cells.empty()) return false;  // blanks behind the last row
  const std::string last = shape(last_cells.back(), decimal);
  std::string before;
  for (std::size_t i = 1; i <= kCompared; ++i) {
    const auto cells = cells_of(lines[lines.size() - 1 - i].text, delimiter);
    const std::string one = cells.empty() ? "" : shape(cells.back(), decimal);
    if (i > 1 && one != before) return false;
    before = one;
  }
  return last.size() < before.size();
}

Result<void> TableJoin::join(const BlockColumns& block) {
  std::size_t from = 0;
  for (const TableBreak& at : block.breaks) {
    if (const auto done = append(block, from, at.row); !done) return done;
    from = at.row;
    pending_.push_back(at);
    pending_.back().line += line_;
  }
  if (block.breaks.size() == BlockColumns::kMostBreaks) {
    const TableBreak* hard = first_hard(pending_);
    return damaged(hard != nullptr ? *hard : pending_.front(), "there are more remarks than rows from here on");
  }
  const auto done = append(block, from, block.rows);
  line_ += block.lines;
  return done;
}

Result<void> TableJoin::append(const BlockColumns& block, std::size_t from, std::size_t to) {
  if (to == from) return {};
  if (!pending_.empty()) {
    if (const auto done = resolve(block, from); !done) return done;
    pending_.clear();
  }
  if (const auto row = store_.row_without_time(block, from, to)) return no_time(block, *row);
  store_.append(block, from, to - from);
  return {};
}

/// A value without its time belongs nowhere; taken as the next one it would move all that follow.
tl::unexpected<Error> TableJoin::no_time(const BlockColumns& block, std::size_t row) const {
  std::size_t line = line_ + row;
  for (const TableBreak& at : block.breaks) line += at.row <= row ? 1 : 0;
  // Blank lines among the rows are passed over and not counted one by one.
  const bool known = block.lines == block.rows + block.breaks.size();
  return failure(Problem::damaged, known ? fmt::format("{}:{}", name_, line) : name_,
                 fmt::format("{} has values and no time", known ? "this row" : "a row"),
                 "repair that row; where the steps are even, leave the column of time out with [file] columns in a bench sheet, and state sample_interval");
}

Result<void> TableJoin::resolve(const BlockColumns& block, std::size_t row) {
  for (const TableBreak& at : pending_) {
    if (!at.words) return damaged(at, at.finding);
  }
  const TableBreak* hard = first_hard(pending_);
  bool another = store_.begins_record(block, row);
  if (!has_time_ && hard != nullptr) {
    another = std::any_of(pending_.begin(), pending_.end(),
                          [](const TableBreak& b) { return !b.comment && introduces_record(b.text); });
  }
  if (another) {
    store_.begin_labelled(label());
  } else if (hard != nullptr && !is_end_mark(hard->text)) {
    return damaged(*hard, hard->finding);
  } else if (hard != nullptr) {
    return damaged(*hard, fmt::format("rows go on after '{}' without starting another record", shown(hard->text, 60)));
  }
  return {};
}

std::string TableJoin::label() const {
  for (const TableBreak& at : pending_) {
    if (at.text != heading_ && !is_end_mark(at.text)) return at.text;
  }
  return "";
}

Result<void> TableJoin::finish(bool last_line_open) {
  for (const TableBreak& at : pending_) {
    if (at.comment || is_end_mark(at.text)) continue;
    const bool cut = last_line_open && &at == &pending_.back();
    return damaged(at, cut ? "the file ends in the middle of a row: " + at.finding : at.finding);
  }
  return {};
}

tl::unexpected<Error> TableJoin::damaged(const TableBreak& at, const std::string& finding) const {
  return failure(Problem::damaged, fmt::format("{}:{}", name_, at.line), finding,
                 "repair or remove that line, or export the waveform again");
}

}  // namespace coilassay

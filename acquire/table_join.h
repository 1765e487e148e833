// Blocks joined to records; what stands between the rows is a new record, a remark, or damage.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "acquire/table_block.h"
#include "acquire/table_store.h"
#include "base/result.h"

namespace coilassay {

/// Whether a line in words announces a record: "Step Information: ...", "Segment 2", "Run 3", "BEGIN".
bool introduces_record(std::string_view line);

/// Whether the last number of a file without a last line end was cut off: it has fewer digits behind the decimal sign, or
/// in its exponent, than the numbers above it all have. `tail` are the last lines.
bool last_number_cut(std::string_view tail, char delimiter, char decimal);

/// Joins blocks in the order of the file.
///
/// A line in words followed by time that starts again begins another record, labelled by it; without a time column its
/// words must say so. Comments are passed over. Anything else among the rows is damage, reported with its line.
class TableJoin {
 public:
  TableJoin(std::string name, std::string heading, std::size_t first_line, bool has_time, TableStore& store)
      : name_(std::move(name)), heading_(std::move(heading)), line_(first_line), has_time_(has_time), store_(store) {}

  Result<void> join(const BlockColumns& block);
  /// After the last block: nothing but an end mark may follow the last row.
  Result<void> finish(bool last_line_open);
  std::size_t lines_read() const { return line_ - 1; }  // the number of the last line

 private:
  Result<void> append(const BlockColumns& block, std::size_t from, std::size_t to);
  Result<void> resolve(const BlockColumns& block, std::size_t row);
  tl::unexpected<Error> no_time(const BlockColumns& block, std::size_t row) const;
  tl::unexpected<Error> damaged(const TableBreak& at, const std::string& finding) const;
  std::string label() const;

  std::string name_;
  std::string heading_;  // the line of names, which may be repeated before each record
  std::size_t line_;     // of the block's first line
  bool has_time_;
  TableStore& store_;
  std::vector<TableBreak> pending_;  // since the last row; lines counted from the start of the file
};

}  // namespace coilassay

// What each column of a table is: time, a row number, a channel, or nothing.
#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "acquire/table_block.h"
#include "acquire/table_header.h"
#include "base/finding.h"

namespace coilassay {

struct ChannelMeaning {
  std::string name;
  std::size_t column = 0;  // counted from 1
  ColumnUnit unit;
  bool unit_stated = false;
  double full_scale = 0;   // 0: not stated
  double resolution = 0;   // 0: not stated
};

struct TableMeaning {
  TableLayout layout;
  std::optional<std::size_t> time;       // index among the stored columns; the channels are the others, in order
  std::vector<ChannelMeaning> channels;
  std::optional<double> interval_s;      // stated
  std::optional<double> start_s;
  std::optional<double> count;
  std::string segment;                   // label of the one record, when stated
  std::vector<Finding> findings;         // contradictions already seen in the headings
};

/// Decides from the headings and the first rows of numbers. In a sweep no column is time: every column is a channel.
///
/// Time is the column named so or with a unit of time; without names, a first column that rises evenly and is no row
/// number (whole numbers in steps of one). Where a heading's unit and a stated interval contradict each other, the
/// stamps decide which of them is right, and a finding says so.
/// @return not_a_capture when no column is left for a channel.
Result<TableMeaning> understand_columns(const std::string& name, const std::vector<TableLine>& lines,
                                        const TableDialect& dialect, const TableHeader& header, const ReadOptions& options,
                                        bool is_sweep = false);

}  // namespace coilassay

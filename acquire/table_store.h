// Blocks of numbers joined, in the order of the file, into captures.
#pragma once

#include <cstddef>
#include <span>
#include <optional>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "acquire/table_block.h"
#include "acquire/table_meaning.h"
#include "acquire/table_time.h"

namespace coilassay {

/// A column that grows without ever being in memory twice: what has been moved is given back at once.
class GrowingColumn {
 public:
  void expect(std::size_t total);  // reserves; untouched memory costs nothing
  void append(std::span<const double> values);
  std::vector<double> take();
  std::size_t size() const { return values_.size(); }

 private:
  void grow_to(std::size_t capacity);
  std::vector<double> values_;
};

class TableStore {
 public:
  TableStore(const TableMeaning& meaning, std::size_t expected_rows);

  /// Joins rows [from, from + count) of a block. Where time jumps back another record begins.
  void append(const BlockColumns& block, std::size_t from, std::size_t count);
  /// The first of these rows whose time is missing.
  std::optional<std::size_t> row_without_time(const BlockColumns& block, std::size_t from, std::size_t to) const;
  /// Whether the row would begin another record by its time.
  bool begins_record(const BlockColumns& block, std::size_t row) const;
  /// The next row begins another record, with this label; before the first row it labels the first.
  void begin_labelled(const std::string& label);
  std::size_t rows() const { return rows_; }
  std::size_t records() const { return records_.size(); }

  /// One capture for each record: samples, time, resolution and the findings about them. Source and dialect are the
  /// caller's.
  std::vector<Capture> finish();

 private:
  struct Record {
    std::vector<GrowingColumn> columns;
    TimeFollower time;
    std::size_t rows = 0;
    std::vector<std::size_t> over_range;  // how many, by channel
    std::string label;
  };
  void begin_record(std::size_t expected_rows);
  void append_rows(const BlockColumns& block, std::size_t from, std::size_t count);
  Capture finish_record(Record& record) const;
  void set_time(const Record& record, Capture& capture) const;

  const TableMeaning& meaning_;
  std::vector<Record> records_;
  std::size_t rows_ = 0;
};

}  // namespace coilassay

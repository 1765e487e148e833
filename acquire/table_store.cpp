#include "acquire/table_store.h"

#include <fmt/format.h>
#include <sys/mman.h>
#include <unistd.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <new>

#include "acquire/table_resolution.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

/// Tells the system that the pages wholly inside [begin, end) are done with; they read as zero from now on.
void give_back(const double* begin, const double* end) {
  const auto page = static_cast<std::uintptr_t>(::sysconf(_SC_PAGESIZE));
  const auto first = (reinterpret_cast<std::uintptr_t>(begin) + page - 1) / page * page;
  const auto last = reinterpret_cast<std::uintptr_t>(end) / page * page;
  if (last > first) ::madvise(reinterpret_cast<void*>(first), last - first, MADV_DONTNEED);
}

}  // namespace

void GrowingColumn::expect(std::size_t total) {
  if (total <= values_.capacity()) return;
  try {
    grow_to(total);
  } catch (const std::bad_alloc&) {
    // So much address space is not to be had at once: the column grows as it is read.
  }
}

void GrowingColumn::append(std::span<const double> values) {
  const std::size_t needed = values_.size() + values.size();
  if (needed > values_.capacity()) grow_to(std::max(needed, values_.capacity() + values_.capacity() / 2));
  values_.insert(values_.end(), values.begin(), values.end());
}

void GrowingColumn::grow_to(std::size_t capacity) {
  constexpr std::size_t kAtOnce = std::size_t{1} << 18U;  // 2 MiB
  std::vector<double> larger;
  larger.reserve(capacity);
  const double* const begin = values_.data();
  for (std::size_t done = 0; done < values_.size(); done += kAtOnce) {
    const std::size_t end = std::min(done + kAtOnce, values_.size());
    larger.insert(larger.end(), begin + done, begin + end);
    if (values_.size() > 4 * kAtOnce) give_back(begin + done, begin + end);
  }
  values_.swap(larger);
}

std::vector<double> GrowingColumn::take() {
  // A reservation that was much too large is only address space, but a small record need not carry it about.
  if (values_.capacity() > 2 * values_.size() + 4096) grow_to(values_.size());
  return std::move(values_);
}

TableStore::TableStore(const TableMeaning& meaning, std::size_t expected_rows) : meaning_(meaning) {
  begin_record(expected_rows);
}

void TableStore::begin_record(std::size_t expected_rows) {
  Record record;
  record.columns.resize(meaning_.channels.size());
  record.over_range.resize(meaning_.channels.size());
  for (GrowingColumn& column : record.columns) column.expect(expected_rows);
  records_.push_back(std::move(record));
}

void TableStore::append(const BlockColumns& block, std::size_t from, std::size_t count) {
  while (count > 0) {
    std::size_t now = count;
    if (meaning_.time) {
      now = records_.back().time.follow({block.values[*meaning_.time].data() + from, count});
      if (now == 0) {
        begin_record(records_.back().rows);
        continue;
      }
    }
    append_rows(block, from, now);
    from += now;
    count -= now;
  }
}

bool TableStore::begins_record(const BlockColumns& block, std::size_t row) const {
  return meaning_.time && records_.back().time.restarts_at(block.values[*meaning_.time][row]);
}

std::optional<std::size_t> TableStore::row_without_time(const BlockColumns& block, std::size_t from, std::size_t to) const {
  if (!meaning_.time) return std::nullopt;
  const double* const stamps = block.values[*meaning_.time].data();
  const double* const found = std::find_if(stamps + from, stamps + to, [](double stamp) { return std::isnan(stamp); });
  if (found == stamps + to) return std::nullopt;
  return static_cast<std::size_t>(found - stamps);
}

void TableStore::begin_labelled(const std::string& label) {
  if (records_.back().rows > 0) begin_record(records_.back().rows);
  records_.back().label = label;
}

void TableStore::append_rows(const BlockColumns& block, std::size_t from, std::size_t count) {
  Record& record = records_.back();
  std::size_t channel = 0;
  for (std::size_t c = 0; c < block.values.size(); ++c) {
    if (meaning_.time == c) continue;
    record.columns[channel].append({block.values[c].data() + from, count});
    const auto& over = block.over_range[c];
    const auto first = std::lower_bound(over.begin(), over.end(), from);
    record.over_range[channel] += static_cast<std::size_t>(std::lower_bound(first, over.end(), from + count) - first);
    ++channel;
  }
  record.rows += count;
  rows_ += count;
}

std::vector<Capture> TableStore::finish() {
  std::vector<Capture> captures;
  for (Record& record : records_) {
    if (record.rows > 0) captures.push_back(finish_record(record));
  }
  if (captures.size() > 1) {
    for (std::size_t i = 0; i < captures.size(); ++i) {
      if (captures[i].segment.empty()) captures[i].segment = std::to_string(i + 1);
    }
  } else if (captures.size() == 1 && captures.front().segment.empty()) {
    captures.front().segment = meaning_.segment;
  }
  return captures;
}

Capture TableStore::finish_record(Record& record) const {
  Capture capture;
  capture.findings = meaning_.findings;
  capture.segment = record.label;
  for (std::size_t c = 0; c < meaning_.channels.size(); ++c) {
    const ChannelMeaning& from = meaning_.channels[c];
    Channel channel;
    channel.name = from.name;
    channel.column = from.column;
    channel.unit = from.unit.unit;
    channel.unit_stated = from.unit_stated;
    if (from.full_scale > 0) channel.full_scale = from.full_scale;
    channel.samples = record.columns[c].take();
    channel.missing = static_cast<std::size_t>(
        std::count_if(channel.samples.begin(), channel.samples.end(), [](double v) { return std::isnan(v); }));
    if (channel.missing == channel.samples.size()) continue;  // a column somebody reserved and nobody filled
    channel.resolution = from.resolution > 0 ? from.resolution : find_resolution(channel.samples);
    if (channel.missing > 0) {
      const std::size_t over = record.over_range[c];
      capture.findings.push_back(
          {"missing_samples", Severity::note,
           fmt::format("{} of {} samples of '{}' are missing{}", channel.missing, channel.samples.size(), shown(channel.name, 60),
                       over > 0 ? fmt::format(", {} of them because the instrument was over range", over) : ""),
           channel.name, static_cast<double>(channel.missing), Unit::one});
    }
    capture.channels.push_back(std::move(channel));
  }
  set_time(record, capture);
  return capture;
}

void TableStore::set_time(const Record& record, Capture& capture) const {
  if (meaning_.time) {
    const TimeStory story = record.time.finish(meaning_.interval_s);
    capture.time = story.axis;
    if (story.every_stamp_twice) {
      capture.findings.push_back({"envelope_export", Severity::caution,
                                  "every time stamp occurs twice: these are the least and the largest value of each interval, "
                                  "not samples; capture again without peak detection",
                                  "time", story.distinct_step_s, Unit::second});
    } else if (story.step_lost) {
      capture.findings.push_back({"uneven_step", Severity::caution,
                                  "the time stamps have too few digits to tell the time step; state it in the bench sheet, or export "
                                  "with more digits",
                                  "time", story.step_doubt, Unit::one});
    } else if (story.step_doubt > 1e-4) {
      capture.findings.push_back({"uneven_step", Severity::caution,
                                  fmt::format("the time stamps have few digits: the time step is known to {:.2g} % only; export with more digits",
                                              100 * story.step_doubt),
                                  "time", story.step_doubt, Unit::one});
    } else if (story.runs_back) {
      capture.findings.push_back({"uneven_step", Severity::caution,
                                  "some time stamps are earlier than those before them: the rows are out of order or a stamp is wrong",
                                  "time", story.largest_deviation_steps, Unit::one});
    } else if (!story.axis.uniform()) {
      capture.findings.push_back({"uneven_step", Severity::note,
                                  fmt::format("the time steps are not even: stamps lie up to {:.3g} steps beside even ones",
                                              story.largest_deviation_steps),
                                  "time", story.largest_deviation_steps, Unit::one});
    }
    const double step = story.every_stamp_twice ? story.distinct_step_s : story.axis.step_s;
    if (meaning_.interval_s && step > 0 && std::fabs(step / *meaning_.interval_s - 1) > 1e-3) {
      capture.findings.push_back({"header_contradicts", Severity::note,
                                  fmt::format("the file states a sample interval of {} s, its time stamps are {:.9g} s apart: "
                                              "the stamps were taken",
                                              *meaning_.interval_s, step),
                                  "time", step, Unit::second});
    }
  } else {
    if (meaning_.interval_s) capture.time.step_s = *meaning_.interval_s;
    if (meaning_.start_s) capture.time.start_s = *meaning_.start_s;
  }
  const auto present = static_cast<double>(record.rows);
  if (meaning_.count && records_.size() == 1 && *meaning_.count != present) {
    capture.findings.push_back({"header_contradicts", Severity::note,
                                fmt::format("the file states {:.0f} samples and holds {:.0f}; it may have been cut short",
                                            *meaning_.count, present),
                                "samples", present, Unit::one});
  }
}

}  // namespace coilassay

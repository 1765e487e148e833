#include "acquire/table_reader.h"

#include <fmt/format.h>

#include <algorithm>

#include "acquire/byte_source_lines.h"
#include "acquire/table_dialect.h"
#include "acquire/table_head.h"
#include "acquire/table_join.h"
#include "acquire/table_meaning.h"
#include "acquire/table_pipeline.h"
#include "acquire/table_store.h"
#include "acquire/table_sweep.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

std::string place(const std::string& name, std::size_t line) { return fmt::format("{}:{}", name, line); }

class TableRead {
 public:
  TableRead(ByteSource& source, const ReadOptions& options) : name_(source.name()), source_(source), blocks_(source), options_(options) {}

  Result<Recording> run() {
    if (const auto got = blocks_.next(block_); !got) return failure(got);
    if (const auto understood = understand(); !understood) return failure(understood);
    if (const auto done = read_rows(); !done) return failure(done);
    std::vector<Capture> list = captures();
    const std::size_t empty = std::erase_if(list, [](const Capture& c) { return c.channels.empty(); });
    if (list.empty()) {
      return failure(Problem::not_a_capture, name_, "no channel holds a single number", "export the waveform again");
    }
    if (empty > 0) {
      list.front().findings.push_back({"missing_samples", Severity::note,
                                       fmt::format("{} of {} records hold no number in any channel and were left out", empty, list.size() + empty),
                                       "", static_cast<double>(empty), Unit::one});
    }
    if (!sweep_plan_) return Recording(std::move(list));
    if (list.size() > 1) {
      return failure(Problem::not_a_capture, name_, fmt::format("it holds {} sweeps one after the other", list.size()),
                     "put each of them into a file of its own");
    }
    list.front().source.name = name_;
    auto sweep = sweep_of(std::move(list.front()), *sweep_plan_);
    if (!sweep) return failure(sweep);
    return Recording(std::move(*sweep));
  }

 private:
  Result<void> understand() {
    const auto head = understand_head(name_, block_.text(), options_);
    if (!head) return failure(head);
    const std::vector<TableLine>& lines = head->lines;
    dialect_ = head->dialect;
    header_ = head->header;
    if (!head->utf8) encoding_ = "windows-1252";
    if (!options_.columns.empty()) {
      const auto fits = apply_reading_key(name_, lines[dialect_.first_row].number, options_.columns, header_);
      if (!fits) return fits;
    }
    sweep_plan_ = plan_sweep(header_);
    auto meaning = understand_columns(name_, lines, dialect_, header_, options_, sweep_plan_.has_value());
    if (!meaning) return failure(meaning);
    meaning_ = std::move(*meaning);
    const TableLine& first = lines[dialect_.first_row];
    first_line_ = first.number;
    first_byte_ = static_cast<std::size_t>(first.text.data() - block_.bytes.data());
    return {};
  }

  /// From the length of the first rows and a quarter more: later ones may be shorter, and untouched memory costs nothing.
  std::size_t expected_rows(const BlockColumns& first) const {
    const std::size_t bytes = block_.size - first_byte_;
    const std::size_t left = source_.size_hint() > block_.size ? source_.size_hint() - block_.size : 0;
    const double row = static_cast<double>(bytes) / static_cast<double>(std::max<std::size_t>(first.rows, 1));
    return first.rows + static_cast<std::size_t>(1.25 * static_cast<double>(left) / row) + (left > 0 ? 1024 : 0);
  }

  Result<void> read_rows() {
    // The first block is read on its own: its rows tell how many to expect.
    BlockColumns columns;
    read_block(block_, first_byte_, meaning_.layout, columns);
    store_.emplace(meaning_, expected_rows(columns));
    TableJoin join(name_, header_.names_line, first_line_, meaning_.time.has_value(), *store_);
    store_->begin_labelled(header_.first_label);
    if (const auto joined = join.join(columns); !joined) return joined;
    if (const auto got = blocks_.next(block_); !got) return failure(got);
    const auto done = read_blocks(std::move(block_), 0, blocks_, meaning_.layout, options_.threads,
                                  [&](const BlockColumns& read) -> Result<void> {
                                    if (stopped()) return failure(Problem::interrupted, name_, "stopped while it was being read", "");
                                    return join.join(read);
                                  });
    if (!done) return done;
    if (const auto ended = join.finish(blocks_.last_line_open()); !ended) return ended;
    if (blocks_.last_line_open() && last_number_cut(blocks_.tail(), dialect_.delimiter, dialect_.decimal)) {
      return failure(Problem::damaged, place(name_, join.lines_read()), "the file ends in the middle of a number", "copy or export it again");
    }
    if (store_->rows() < 2) {
      return failure(Problem::too_few_samples, place(name_, first_line_), "it has one row of numbers only",
                     "export the whole waveform");
    }
    return {};
  }

  bool stopped() const {
    return options_.progress != nullptr &&
           !options_.progress->advance("reading " + shown(name_), blocks_.bytes_read(), source_.size_hint());
  }

  std::vector<Capture> captures() {
    std::vector<Capture> list = store_->finish();
    for (Capture& capture : list) {
      capture.dialect.format = "table";
      capture.dialect.encoding = encoding_;
      capture.dialect.delimiter = std::string(1, dialect_.delimiter);
      capture.dialect.decimal = std::string(1, dialect_.decimal);
      capture.dialect.first_data_line = first_line_;
      capture.dialect.settings = header_.settings;
    }
    return list;
  }

  std::string name_;
  ByteSource& source_;
  LineBlocks blocks_;
  const ReadOptions& options_;
  LineBlock block_;
  std::string encoding_ = "utf-8";
  TableDialect dialect_;
  TableHeader header_;
  TableMeaning meaning_;
  std::optional<SweepPlan> sweep_plan_;
  std::optional<TableStore> store_;
  std::size_t first_line_ = 0;
  std::size_t first_byte_ = 0;
};

class TableReader final : public Reader {
 public:
  std::string_view format_name() const override { return "table"; }
  bool recognises(std::string_view, std::string_view) const override { return true; }  // asked last
  Result<Recording> read(ByteSource& bytes, std::string_view, const ReadOptions& options) const override {
    return TableRead(bytes, options).run();
  }
};

}  // namespace

std::unique_ptr<Reader> table_reader() { return std::make_unique<TableReader>(); }

}  // namespace coilassay

#include "app/runs/acquire_run.h"

#include <algorithm>
#include <cmath>
#include <nlohmann/json.hpp>
#include <sstream>
#include <thread>

#include "acquire/capture_writer.h"
#include "acquire/instrument/instrument.h"
#include "acquire/instrument/open_stream.h"
#include "acquire/instrument/row_file.h"
#include "analysis/reading.h"
#include "app/runs/spared_files.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using Clock = std::chrono::steady_clock;

/// Waits for the next turn; false when stopped.
bool wait_until(SteadyTime turn, const std::function<bool()>& stopped) {
  for (;;) {
    if (stopped && stopped()) return false;
    const auto now = Clock::now();
    if (now >= turn) return true;
    std::this_thread::sleep_for(std::min<Span>(turn - now, kSlice));
  }
}

Channel channel_of(const std::string& name, Unit unit, bool stated) {
  Channel channel;
  channel.name = name;
  channel.unit = unit;
  channel.unit_stated = stated;
  return channel;
}

/// Head and names of a file of readings; the rows come one by one.
std::string head_of_readings(const Instrument& instrument, UtcTime begun) {
  Capture capture;
  capture.dialect.settings = instrument.head();
  capture.dialect.settings["begun"] = to_text(begun);
  capture.channels.push_back(channel_of("time", Unit::second, true));
  for (const ProfileField& field : instrument.profile().reading->fields) {
    if (field.is_value()) capture.channels.push_back(channel_of(field.symbol, field.unit, field.unit != Unit::one));
  }
  std::ostringstream head;
  write_capture_csv(head, capture);
  return head.str();
}

std::string row_of(double at_s, const Reading& reading) {
  std::string row = to_shortest(at_s);
  for (const ReadingValue& value : reading.values) {
    row += ',';
    if (value.state == ValueState::over_range) row += "OL";
    else if (!reading.status_ok) row += "nan";
    else row += to_shortest(value.value);
  }
  return row + "\n";
}

std::string in_words(const Reading& reading) {
  std::string words;
  for (const ReadingValue& value : reading.values) {
    words += (words.empty() ? "" : ", ") + shown(value.symbol, 20) + " " +
             (value.state == ValueState::over_range ? std::string("no value") : to_text(value.value, value.unit, Script::utf8, 6));
  }
  if (!reading.status_ok) words += " (status " + shown(reading.status, 20) + ": not used)";
  return words;
}

struct Session {
  const AcquireJob& job;
  Instrument& instrument;
  RowFile& file;
  AcquireSummary& summary;
};

Result<void> acquire_readings(Session& s, UtcTime begun) {
  s.summary.what = "readings";
  if (auto head = s.file.append(head_of_readings(s.instrument, begun)); !head) return head;
  const SteadyTime start = Clock::now();
  const double pace = s.job.every_s.value_or(0);
  for (std::uint64_t n = 0; !s.job.count || n < *s.job.count; ++n) {
    const auto turn = start + std::chrono::duration_cast<Span>(std::chrono::duration<double>(pace * static_cast<double>(n)));
    if (!wait_until(turn, s.job.stopped)) break;
    const double at_s = n == 0 ? 0 : std::round(std::chrono::duration<double>(Clock::now() - start).count() * 1e6) / 1e6;
    auto reading = s.instrument.read();
    if (!reading) {
      if (reading.error().problem == Problem::interrupted) break;
      if (s.instrument.is_gone()) return failure(reading);
      // Not readable this time: the row says so, and the next turn comes.
      if (s.job.remark) s.job.remark(reading.error().finding);
      ++s.summary.unreadable;
      s.summary.last_trouble = reading.error().finding;
      Reading none;
      for (const ProfileField& field : s.instrument.profile().reading->fields) {
        if (field.is_value()) none.values.push_back({field.symbol, field.unit});
      }
      none.status_ok = false;
      reading = std::move(none);
    }
    if (auto row = s.file.append(row_of(at_s, *reading)); !row) return row;
    ++s.summary.rows;
    if (!reading->good()) ++s.summary.without_value;
    const bool any = std::any_of(reading->values.begin(), reading->values.end(), [](const ReadingValue& v) { return std::isfinite(v.value) && v.state == ValueState::measured; });
    if (!reading->status_ok || !any) ++s.summary.useless;
    if (s.job.row_written) s.job.row_written(in_words(*reading));
  }
  s.summary.stopped = s.job.stopped && s.job.stopped();
  return {};
}

Result<void> acquire_records(Session& s, UtcTime begun) {
  s.summary.what = "records";
  const std::uint64_t count = s.job.count.value_or(1);
  const SteadyTime start = Clock::now();
  const double pace = s.job.every_s.value_or(0);
  for (std::uint64_t n = 0; n < count; ++n) {
    const auto turn = start + std::chrono::duration_cast<Span>(std::chrono::duration<double>(pace * static_cast<double>(n)));
    if (!wait_until(turn, s.job.stopped)) break;
    auto record = s.instrument.record();
    if (!record) {
      if (record.error().problem == Problem::interrupted) break;
      return failure(record);
    }
    record->dialect.settings["begun"] = to_text(begun);
    if (count > 1) record->segment = "Segment " + std::to_string(n + 1);
    std::ostringstream text;
    write_capture_csv(text, *record);
    std::string lines = text.str();
    if (n > 0) {
      // Another segment of the same table: a line of words, then its rows.
      lines.erase(0, lines.find("time [s]"));
      lines.erase(0, lines.find('\n') + 1);
      lines.insert(0, "Segment " + std::to_string(n + 1) + "\n");
    }
    if (auto written = s.file.append(lines); !written) return written;
    ++s.summary.rows;
    if (s.job.row_written) s.job.row_written(std::to_string(record->samples()) + " samples of " + std::to_string(record->channels.size()) + " channels");
  }
  s.summary.stopped = s.job.stopped && s.job.stopped();
  return {};
}

}  // namespace

Result<AcquireSummary> run_acquire(const AcquireJob& job, const RunContext& context) {
  auto profile = read_instrument_profile(job.profile);
  if (!profile) return failure(profile);
  if (auto fine = check_profile_symbols(*profile, false); !fine) return failure(fine);
  const bool records = profile->record && (!profile->reading || (!job.count && !job.every_s));
  std::shared_ptr<ByteLog> log;
  if (job.trace) {
    // A recorded session that is played is read while the log is written.
    if (auto spared = spare_files(std::vector<GivenFile>{{"--trace", *job.trace}}, std::vector<GivenFile>{{"", profile->link.port}}); !spared) return failure(spared);
    auto begun = ByteLog::begin(*job.trace, "coilassay trace of " + job.profile + ", begun " + to_text(context.now));
    if (!begun) return failure(begun);
    log = *begun;
  }
  auto file = RowFile::create(job.file);
  if (!file) return failure(file);
  Instrument instrument(*profile, opener_of(profile->link, log), job.stopped, job.remark);
  AcquireSummary summary;
  summary.file = job.file;
  auto done = instrument.open();
  if (!done && job.file != "-") std::remove(job.file.c_str());  // nothing came: nothing is kept
  if (!done) return failure(done);
  summary.instrument = instrument.identity();
  summary.settings = instrument.settings();
  Session session{job, instrument, *file, summary};
  done = records ? acquire_records(session, context.now) : acquire_readings(session, context.now);
  if (auto finished = file->finish(); done && !finished) done = finished;
  if (!done) {
    Error error = done.error();
    if (summary.rows > 0) error.finding += " (" + std::to_string(summary.rows) + " " + summary.what + " are kept in " + shown(job.file, 100) + ")";
    return tl::make_unexpected(std::move(error));
  }
  const ConversationCounts& counts = instrument.counts();
  summary.timeouts = counts.timeouts;
  summary.resynchronised = counts.resynchronisations > 0 ? counts.resynchronisations - 1 : 0;  // the first is that of opening
  summary.reconnected = counts.reconnections;
  return summary;
}

std::string to_json(const AcquireSummary& summary) {
  nlohmann::ordered_json document;
  document["schema"] = "coilassay.acquire/1";
  document["file"] = json_safe(summary.file);
  document["instrument"] = summary.instrument.empty() ? nlohmann::ordered_json(nullptr) : nlohmann::ordered_json(json_safe(summary.instrument));
  document[summary.what] = summary.rows;
  if (summary.what == "readings") document["without_value"] = summary.without_value;
  auto& settings = document["settings"] = nlohmann::ordered_json::object();
  for (const auto& [name, reply] : summary.settings) settings[json_safe(name)] = json_safe(reply);
  document["timeouts"] = summary.timeouts;
  document["resynchronised"] = summary.resynchronised;
  document["reconnected"] = summary.reconnected;
  document["stopped"] = summary.stopped;
  return json_text(document);
}

}  // namespace coilassay

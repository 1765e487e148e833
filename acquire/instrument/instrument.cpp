#include "acquire/instrument/instrument.h"

#include <cmath>

#include "acquire/instrument/block.h"
#include "acquire/instrument/pattern.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

Instrument::Instrument(InstrumentProfile profile, StreamOpener opener, std::function<bool()> stopped, Remark remark)
    : profile_(std::move(profile)),
      line_(profile_.link, profile_.identity, std::move(opener), std::move(stopped)),
      remark_(std::move(remark)) {}

/// Asks until it works, as often as may help.
template <class T>
Result<T> Instrument::repeated(std::size_t attempts, const std::function<Answer<T>()>& once) {
  const auto begun = std::chrono::steady_clock::now();
  for (std::size_t attempt = 1;; ++attempt) {
    Answer<T> answer = once();
    if (answer) return std::move(*answer);
    const Upset& upset = answer.error();
    const std::chrono::duration<double> waited = std::chrono::steady_clock::now() - begun;
    const bool patient = (upset.trouble == Trouble::silent || upset.trouble == Trouble::lost) && waited.count() < profile_.link.reconnect_s;
    if (!may_be_tried_again(upset.trouble) || (attempt >= attempts && !patient)) {
      gone_ = upset.trouble == Trouble::gone || upset.trouble == Trouble::other_identity || upset.trouble == Trouble::silent || upset.trouble == Trouble::lost;
      return tl::make_unexpected(upset.error);
    }
    if (remark_) remark_(upset.error.finding + "; it is asked again");
  }
}

Result<void> Instrument::open() {
  const bool unasked = profile_.reading && !profile_.reading->ask;
  if (auto opened = line_.open(unasked); !opened) {
    gone_ = true;
    return tl::make_unexpected(opened.error().error);
  }
  for (const std::string& command : profile_.prepare) {
    if (auto sent = line_.tell(command); !sent) return tl::make_unexpected(sent.error().error);
  }
  settings_.clear();
  for (const SettingQuestion& setting : profile_.settings) {
    auto reply = repeated<std::string>(3, [&] { return line_.ask(setting.ask); });
    if (!reply) return failure(reply);
    settings_.emplace_back(setting.name, *reply);
  }
  return {};
}

Answer<Reading> Instrument::read_once() {
  const ReadingSetup& setup = *profile_.reading;
  auto line = setup.ask ? line_.ask(*setup.ask) : line_.next_line();
  if (!line) return tl::make_unexpected(line.error());
  auto reading = parse_reading(setup, *line, line_.place());
  if (reading) return std::move(*reading);
  line_.distrust();
  return tl::make_unexpected(Upset{Trouble::unreadable, reading.error()});
}

Result<Reading> Instrument::read() {
  if (!profile_.reading) {
    return failure(Problem::instrument, profile_.path, "the profile has no [reading]", "say what is asked and which fields come: [reading] ask, fields");
  }
  return repeated<Reading>(profile_.reading->attempts, [this] { return read_once(); });
}

Answer<std::vector<std::vector<double>>> Instrument::record_once() {
  const RecordSetup& setup = *profile_.record;
  std::vector<std::vector<double>> columns(setup.fields.size());
  const auto unreadable = [&](std::string finding) {
    line_.distrust();
    return tl::make_unexpected(Upset{Trouble::unreadable, {Problem::instrument, line_.place(), std::move(finding), "look at format, count and fields in [record]"}});
  };
  const bool one_for_all = setup.ask.size() == 1;
  for (std::size_t q = 0; q < setup.ask.size(); ++q) {
    const std::size_t first = one_for_all ? 0 : q, width = one_for_all ? setup.fields.size() : 1;
    if (setup.format == RecordSetup::Format::rows) {
      auto lines = line_.ask_rows(setup.ask[q], setup.count);
      if (!lines) return tl::make_unexpected(lines.error());
      RecordSetup part = setup;
      part.fields.assign(setup.fields.begin() + static_cast<long>(first), setup.fields.begin() + static_cast<long>(first + width));
      part.scale.assign(setup.scale.begin() + static_cast<long>(first), setup.scale.begin() + static_cast<long>(first + width));
      part.offset.assign(setup.offset.begin() + static_cast<long>(first), setup.offset.begin() + static_cast<long>(first + width));
      for (std::size_t row = 0; row < lines->size(); ++row) {
        const auto values = parse_row(part, (*lines)[row], line_.place());
        if (!values) return unreadable("row " + std::to_string(row + 1) + ": " + values.error().finding);
        std::size_t next = 0;
        for (std::size_t i = 0; i < width; ++i) {
          if (setup.fields[first + i].is_value()) columns[first + i].push_back((*values)[next++]);
        }
      }
      continue;
    }
    const std::size_t bytes = setup.count * width * bytes_per_sample(setup.format);
    auto payload = line_.ask_block(setup.ask[q], bytes);
    if (!payload) return tl::make_unexpected(payload.error());
    if (payload->size() != bytes) {
      return unreadable("the block has " + std::to_string(payload->size()) + " bytes where " + std::to_string(bytes) + " are stated");
    }
    const std::vector<double> raw = raw_samples(*payload, setup.format, setup.big_endian);
    for (std::size_t i = 0; i < raw.size(); ++i) {
      const std::size_t field = first + i % width;
      columns[field].push_back(raw[i] * setup.scale[field] + setup.offset[field]);
    }
  }
  return columns;
}

Result<Capture> Instrument::record() {
  if (!profile_.record) {
    return failure(Problem::instrument, profile_.path, "the profile has no [record]", "say what is asked, in which format, and how many samples come: [record]");
  }
  const RecordSetup& setup = *profile_.record;
  auto columns = repeated<std::vector<std::vector<double>>>(3, [this] { return record_once(); });
  if (!columns) return failure(columns);
  Capture capture;
  capture.source.name = line_.place();
  capture.source.identity = identity();
  capture.dialect.format = "instrument";
  capture.dialect.settings = head();
  capture.time.start_s = 0;
  capture.time.step_s = setup.sample_interval_s;
  for (std::size_t i = 0; i < setup.fields.size(); ++i) {
    if (!setup.fields[i].is_value()) continue;
    Channel channel;
    channel.name = setup.fields[i].symbol;
    channel.unit = setup.fields[i].unit;
    channel.unit_stated = true;
    channel.column = capture.channels.size() + 2;
    channel.samples = std::move((*columns)[i]);
    for (const double sample : channel.samples) if (std::isnan(sample)) ++channel.missing;
    if (setup.format == RecordSetup::Format::int8 || setup.format == RecordSetup::Format::int16) {
      channel.resolution = std::abs(setup.scale[i]);
      channel.full_scale = (setup.format == RecordSetup::Format::int8 ? 128.0 : 32768.0) * channel.resolution + std::abs(setup.offset[i]);
    }
    capture.channels.push_back(std::move(channel));
  }
  return capture;
}

Result<bool> Instrument::part_present() {
  if (!profile_.present || !profile_.present->ask) return true;
  const auto pattern = Pattern::compile(profile_.present->when, profile_.path);
  if (!pattern) return failure(pattern);
  const auto reply = repeated<std::string>(3, [this] { return line_.ask(*profile_.present->ask); });
  if (!reply) return failure(reply);
  return pattern->is_all_of(*reply);
}

Result<void> Instrument::show_verdict(const std::string& command) {
  if (command.empty()) return {};
  if (auto sent = line_.tell(command); !sent) {
    gone_ = sent.error().trouble == Trouble::gone || sent.error().trouble == Trouble::other_identity;
    return tl::make_unexpected(sent.error().error);
  }
  return {};
}

std::map<std::string, std::string> Instrument::head() const {
  std::map<std::string, std::string> head;
  head["origin"] = "instrument";
  if (!identity().empty()) head["instrument"] = identity();
  head["profile"] = profile_.path;
  for (const auto& [name, reply] : settings_) head["setting " + name] = reply;
  if (profile_.reading) head.merge(conditions_in_words(profile_.reading->at));
  return head;
}

std::map<std::string, std::string> conditions_in_words(const StatedConditions& at) {
  std::map<std::string, std::string> words;
  const auto say = [&](const char* name, const std::optional<StatedValue>& value) {
    if (value) words[name] = to_text(value->value, value->unit, Script::ascii, 7);
  };
  say("measured at frequency", at.frequency);
  say("measured at level", at.level_v ? at.level_v : at.level_a);
  say("measured at bias", at.bias);
  say("measured at temperature", at.temperature);
  return words;
}

}  // namespace coilassay

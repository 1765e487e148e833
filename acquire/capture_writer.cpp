#include "acquire/capture_writer.h"

#include <array>
#include <cassert>
#include <charconv>
#include <cmath>
#include <limits>
#include <ostream>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

constexpr std::size_t kBlock = std::size_t{1} << 16;  // characters handed on at once
constexpr std::size_t kAllOfIt = 4096;                // longest name or setting that is kept whole

constexpr const char* kIntervalKey = "sample interval";
constexpr const char* kStartKey = "start time";
constexpr const char* kSegmentKey = "segment";

/// The shortest text that reads back to the same double, or nan.
void append(std::string& text, double value) {
  if (!std::isfinite(value)) {
    text += std::isnan(value) ? "nan" : value > 0 ? "inf" : "-inf";
    return;
  }
  std::array<char, 32> digits{};
  const auto end = std::to_chars(digits.data(), digits.data() + digits.size(), value);
  text.append(digits.data(), end.ptr);
}

/// Line breaks and the like would end a row.
std::string cell(const std::string& outside) {
  return csv_cell(shown(outside, kAllOfIt));
}

void append_setting(std::string& text, const std::string& key, const std::string& value) {
  // Two numbers would be taken for the first row of samples.
  if (key.empty() || parse_plain_number(key)) text += "# ";
  text += cell(key) + "," + cell(value) + "\n";
}

std::string name_of(const Channel& channel, std::size_t position) {
  std::string name = channel.name.empty() ? "channel " + std::to_string(position) : channel.name;
  if (channel.unit_stated) name += " [" + std::string(symbol(channel.unit)) + "]";
  return cell(name);
}

void append_header(std::string& text, const Capture& capture, bool time_column) {
  const TimeAxis& time = capture.time;
  // Beside the time column: the step itself, free of the rounding in a difference of times.
  if (time.uniform() && std::isfinite(time.step_s)) {
    text += kIntervalKey;
    text += ",";
    append(text, time.step_s);
    text += ",s\n";
    if (std::isfinite(time.start_s)) {
      text += kStartKey;
      text += ",";
      append(text, time.start_s);
      text += ",s\n";
    }
  }
  if (!capture.segment.empty()) append_setting(text, kSegmentKey, capture.segment);
  std::vector<std::string> written{kIntervalKey, kStartKey, kSegmentKey};
  for (std::size_t i = 0; i < capture.channels.size(); ++i) {
    const Channel& channel = capture.channels[i];
    const auto say = [&](const char* what, double value) {
      if (!std::isfinite(value) || channel.name.empty()) return;
      written.push_back(channel.name + ":" + what);
      text += cell(written.back()) + ",";
      append(text, value);
      if (channel.unit_stated) text += "," + std::string(symbol(channel.unit));
      text += "\n";
    };
    say("full scale", channel.full_scale);
    say("resolution", channel.resolution);
  }
  for (const auto& [key, value] : capture.dialect.settings) {
    bool already = false;
    for (const std::string& other : written) already = already || other == key;
    if (!already) append_setting(text, key, value);
  }
  if (time_column) text += "time [s]";
  for (std::size_t i = 0; i < capture.channels.size(); ++i) {
    if (i > 0 || time_column) text += ",";
    text += name_of(capture.channels[i], i + (time_column ? 2 : 1));
  }
  text += "\n";
}

}  // namespace

void write_capture_csv(std::ostream& out, const Capture& capture) {
  const TimeAxis& time = capture.time;
  const std::size_t samples = capture.samples();
  for (const Channel& channel : capture.channels) {
    assert(channel.samples.size() == samples);
    static_cast<void>(channel);
  }
  assert(time.uniform() || time.times_s.size() == samples);
  const bool time_column = !time.uniform() || (std::isfinite(time.step_s) && std::isfinite(time.start_s));
  std::string text;
  text.reserve(kBlock + 4096);
  append_header(text, capture, time_column);
  for (std::size_t n = 0; n < samples; ++n) {
    if (time_column)
      append(text, time.uniform() ? time.start_s + static_cast<double>(n) * time.step_s : time.times_s[n]);
    for (std::size_t i = 0; i < capture.channels.size(); ++i) {
      if (i > 0 || time_column) text += ',';
      append(text, capture.channels[i].samples[n]);
    }
    text += '\n';
    if (text.size() >= kBlock) {
      out.write(text.data(), static_cast<std::streamsize>(text.size()));
      text.clear();
    }
  }
  out.write(text.data(), static_cast<std::streamsize>(text.size()));
}

}  // namespace coilassay

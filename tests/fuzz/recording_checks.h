// What must be true of everything a reader gives, whatever it was fed.
#pragma once

#include <cmath>
#include <span>
#include <string>
#include <variant>

#include "acquire/byte_source_head.h"
#include "acquire/byte_source_text.h"
#include "acquire/reader.h"
#include "tests/fuzz/target.h"

namespace coilassay::fuzz {

inline void check_refusal(const Error& error) {
  require(!error.finding.empty(), "a refusal says what was found");
  require(!error.place.empty(), "a refusal says where");
}

inline void check_capture(const Capture& capture) {
  const auto& channels = capture.channels;
  require(!channels.empty(), "a capture has a channel");
  const std::size_t rows = channels.front().samples.size();
  for (const Channel& channel : channels) {
    require(channel.samples.size() == rows, "channels of a capture are equally long");
    std::size_t missing = 0;
    for (const double sample : channel.samples) {
      if (std::isnan(sample)) ++missing;
      else require(std::isfinite(sample), "a sample is a number or missing");
    }
    require(missing == channel.missing, "missing samples are counted");
  }
  require(capture.time.uniform() || capture.time.times_s.size() == rows, "each sample has its time");
  require(std::isnan(capture.time.step_s) || capture.time.step_s > 0, "time runs forward");
  for (const double time : capture.time.times_s) require(std::isfinite(time), "a time is a number");
}

inline void check_sweep(const Sweep& sweep) {
  const std::size_t points = sweep.frequency_hz.size();
  require(points > 0, "a sweep has a point");
  require(sweep.z_ohm.size() == points && sweep.bad.size() == points, "each point has its matrix and mark");
  for (const auto& matrix : sweep.z_ohm) require(matrix.size() == sweep.ports * sweep.ports, "a matrix is as large as its ports say");
  for (std::size_t i = 0; i < points; ++i) {
    require(sweep.bad[i] || (std::isfinite(sweep.frequency_hz[i]) && sweep.frequency_hz[i] >= 0), "a usable point has a frequency");
  }
}

/// A stream of bytes in memory.
class InputBytes final : public ByteSource {
 public:
  InputBytes(std::string name, std::string_view bytes) : name_(std::move(name)), rest_(bytes) {}
  const std::string& name() const override { return name_; }
  Result<std::size_t> read(std::span<char> into) override {
    const std::size_t n = rest_.copy(into.data(), into.size());
    rest_.remove_prefix(n);
    return n;
  }
  std::size_t size_hint() const override { return rest_.size(); }

 private:
  std::string name_;
  std::string_view rest_;
};

inline void check_recording(const Result<Recording>& recording) {
  if (!recording) return check_refusal(recording.error());
  if (const auto* captures = std::get_if<std::vector<Capture>>(&*recording)) {
    require(!captures->empty(), "there is a capture");
    for (const Capture& capture : *captures) check_capture(capture);
  } else {
    check_sweep(std::get<Sweep>(*recording));
  }
}

/// Reads it by the first reader that recognises it, as every command does, but without a file, a digest and its thread.
inline void check_reading(const std::string& name, std::string_view bytes) {
  constexpr std::size_t kLookAhead = 4096;
  InputBytes input(name, bytes);
  HeadedBytes headed(input);
  const auto head = headed.look_ahead(kLookAhead);
  const TextStream text = as_text(headed, *head);
  HeadedBytes text_headed(text.bytes ? *text.bytes : headed);
  const auto text_head = text_headed.look_ahead(kLookAhead);
  if (!text_head) return check_refusal(text_head.error());
  ReadOptions options;
  options.threads = 1;
  for (const auto& reader : readers()) {
    if (!reader->recognises(name, *text_head)) continue;
    return check_recording(reader->read(text_headed, *text_head, options));
  }
}

}  // namespace coilassay::fuzz

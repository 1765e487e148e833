// The one file that includes libsndfile.
#include "acquire/wav_reader.h"

#include <fmt/format.h>
#include <sndfile.h>

#include <algorithm>
#include <cmath>
#include <cstring>

#include "acquire/read_block.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

constexpr std::size_t kBlock = kReadBlock;
constexpr std::size_t kMostBytes = std::size_t{8} << 30U;
constexpr int kMostChannels = 256;

/// A stream held in blocks, so that the library can seek in it; what lies behind the reader is given back.
class HeldBytes {
 public:
  Result<void> hold(ByteSource& source, const ReadOptions& options) {
    for (;;) {
      std::vector<char> block(kBlock);
      const auto got = source.read(block);
      if (!got) return failure(got);
      block.resize(*got);
      size_ += *got;
      if (*got > 0) blocks_.push_back(std::move(block));
      if (size_ > kMostBytes) {
        return failure(Problem::not_a_capture, source.name(), fmt::format("it has more than {} bytes", kMostBytes),
                       "cut the recording into shorter ones");
      }
      if (options.progress != nullptr &&
          !options.progress->advance("reading " + shown(source.name()), size_, source.size_hint())) {
        return failure(Problem::interrupted, source.name(), "stopped while it was being read", "");
      }
      if (*got < kBlock) return {};
    }
  }

  std::size_t size() const { return size_; }
  void forget_passed() { forgetting_ = true; }

  /// Four bytes, least significant first; 0 beyond the end.
  std::uint32_t number_at(std::size_t at) const {
    std::uint32_t value = 0;
    for (std::size_t i = 0; i < 4 && at + i < size_; ++i) {
      value |= static_cast<std::uint32_t>(static_cast<unsigned char>(blocks_[(at + i) / kBlock][(at + i) % kBlock])) << (8 * i);
    }
    return value;
  }

  static sf_count_t length(void* self) { return static_cast<sf_count_t>(static_cast<HeldBytes*>(self)->size_); }
  static sf_count_t tell(void* self) { return static_cast<sf_count_t>(static_cast<HeldBytes*>(self)->at_); }
  static sf_count_t write(const void*, sf_count_t, void*) { return 0; }

  static sf_count_t seek(sf_count_t offset, int whence, void* user) {
    auto& self = *static_cast<HeldBytes*>(user);
    const auto from = static_cast<sf_count_t>(whence == SEEK_SET ? 0 : whence == SEEK_CUR ? self.at_ : self.size_);
    const sf_count_t to = std::clamp<sf_count_t>(from + offset, 0, static_cast<sf_count_t>(self.size_));
    self.at_ = static_cast<std::size_t>(to);
    return to;
  }

  static sf_count_t read(void* into, sf_count_t count, void* user) {
    auto& self = *static_cast<HeldBytes*>(user);
    std::size_t done = 0;
    while (done < static_cast<std::size_t>(count) && self.at_ < self.size_) {
      std::vector<char>& block = self.blocks_[self.at_ / kBlock];
      const std::size_t within = self.at_ % kBlock;
      if (within >= block.size()) break;  // given back already
      const std::size_t now = std::min(static_cast<std::size_t>(count) - done, block.size() - within);
      std::memcpy(static_cast<char*>(into) + done, block.data() + within, now);
      done += now;
      self.at_ += now;
      if (self.forgetting_ && within + now == block.size()) std::vector<char>().swap(block);
    }
    return static_cast<sf_count_t>(done);
  }

 private:
  std::vector<std::vector<char>> blocks_;
  std::size_t size_ = 0;
  std::size_t at_ = 0;
  bool forgetting_ = false;
};

/// Bits of a sample, or 0 for kinds whose codes are not evenly spaced.
int bits_of(int format) {
  switch (format & SF_FORMAT_SUBMASK) {
    case SF_FORMAT_PCM_U8:
    case SF_FORMAT_PCM_S8: return 8;
    case SF_FORMAT_PCM_16: return 16;
    case SF_FORMAT_PCM_24: return 24;
    case SF_FORMAT_PCM_32: return 32;
    default: return 0;
  }
}

std::string kind_of(int format) {
  if (const int bits = bits_of(format); bits > 0) return fmt::format("{} bit", bits);
  switch (format & SF_FORMAT_SUBMASK) {
    case SF_FORMAT_FLOAT: return "32 bit float";
    case SF_FORMAT_DOUBLE: return "64 bit float";
    default: return "";
  }
}

class Handle {
 public:
  Handle(SF_VIRTUAL_IO& io, SF_INFO& info, HeldBytes& bytes) : file_(::sf_open_virtual(&io, SFM_READ, &info, &bytes)) {}
  ~Handle() {
    if (file_ != nullptr) ::sf_close(file_);
  }
  Handle(const Handle&) = delete;
  Handle& operator=(const Handle&) = delete;
  SNDFILE* get() const { return file_; }

 private:
  SNDFILE* file_;
};

Capture described(const SF_INFO& info, const std::string& kind) {
  Capture capture;
  capture.time.step_s = 1.0 / info.samplerate;
  capture.dialect.format = "wav";
  capture.dialect.settings["sample rate"] = fmt::format("{} Hz", info.samplerate);
  capture.dialect.settings["sample format"] = kind;
  const int bits = bits_of(info.format);
  for (int c = 0; c < info.channels; ++c) {
    Channel channel;
    channel.name = fmt::format("CH{}", c + 1);
    channel.column = static_cast<std::size_t>(c) + 1;
    channel.full_scale = 1;
    if (bits > 0) channel.resolution = std::ldexp(1.0, 1 - bits);
    channel.samples.reserve(static_cast<std::size_t>(info.frames));
    capture.channels.push_back(std::move(channel));
  }
  return capture;
}

void take_samples(SNDFILE* file, Capture& capture) {
  const std::size_t channels = capture.channels.size();
  constexpr sf_count_t kFrames = 4096;
  std::vector<double> frames(static_cast<std::size_t>(kFrames) * channels);
  for (sf_count_t got = kFrames; got == kFrames;) {
    got = ::sf_readf_double(file, frames.data(), kFrames);
    for (std::size_t c = 0; c < channels; ++c) {
      Channel& channel = capture.channels[c];
      for (std::size_t i = 0; i < static_cast<std::size_t>(got); ++i) {
        double value = frames[i * channels + c];
        if (!std::isfinite(value)) {  // only files of floats can hold that
          value = std::nan("");
          ++channel.missing;
        }
        channel.samples.push_back(value);
      }
    }
  }
  for (const Channel& channel : capture.channels) {
    if (channel.missing == 0) continue;
    capture.findings.push_back({"missing_samples", Severity::note,
                                fmt::format("{} of {} samples of '{}' are no numbers", channel.missing, channel.samples.size(), channel.name),
                                channel.name, static_cast<double>(channel.missing), Unit::one});
  }
}

class WavReader final : public Reader {
 public:
  std::string_view format_name() const override { return "wav"; }

  bool recognises(std::string_view, std::string_view first_bytes) const override {
    return first_bytes.size() >= 12 && (first_bytes.starts_with("RIFF") || first_bytes.starts_with("RF64")) &&
           first_bytes.substr(8, 4) == "WAVE";
  }

  Result<Recording> read(ByteSource& source, std::string_view first_bytes, const ReadOptions& options) const override {
    const std::string& name = source.name();
    HeldBytes bytes;
    const bool plain_riff = first_bytes.starts_with("RIFF");
    if (const auto held = bytes.hold(source, options); !held) return failure(held);
    const std::size_t stated = plain_riff ? std::size_t{bytes.number_at(4)} + 8 : 0;
    SF_VIRTUAL_IO io{HeldBytes::length, HeldBytes::seek, HeldBytes::read, HeldBytes::write, HeldBytes::tell};
    SF_INFO info{};
    const Handle file(io, info, bytes);
    if (file.get() == nullptr) {
      return failure(Problem::damaged, name, fmt::format("the sound file cannot be read: {}", ::sf_strerror(nullptr)),
                     "export it as WAV with 16 or 24 bit samples");
    }
    const std::string kind = kind_of(info.format);
    if (kind.empty()) {
      return failure(Problem::not_a_capture, name, "its samples are compressed in a way that changes them",
                     "record or export it as WAV with 16 or 24 bit samples");
    }
    if (info.channels > kMostChannels || info.samplerate <= 0) {
      return failure(Problem::damaged, name, fmt::format("it claims {} channels at {} Hz", info.channels, info.samplerate), "record it again");
    }
    Capture capture = described(info, kind);
    bytes.forget_passed();
    take_samples(file.get(), capture);
    if (capture.samples() < 2) {
      return failure(Problem::too_few_samples, name, fmt::format("it holds {} samples", capture.samples()), "record it again");
    }
    // Streams are written with a length nobody knew: zero, or all ones but for the sign.
    constexpr std::size_t kNobodyKnew = 0x7FFFFFFF - std::size_t{0x10000};
    if (stated > bytes.size() && stated < kNobodyKnew) {
      capture.findings.push_back({"header_contradicts", Severity::note,
                                  fmt::format("the file states {} bytes and holds {}; it was cut short", stated, bytes.size()), "samples",
                                  static_cast<double>(capture.samples()), Unit::one});
    }
    std::vector<Capture> captures;
    captures.push_back(std::move(capture));
    return captures;
  }
};

}  // namespace

std::unique_ptr<Reader> wav_reader() { return std::make_unique<WavReader>(); }

}  // namespace coilassay

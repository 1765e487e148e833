#include "acquire/byte_source_unpack.h"

#include <fmt/format.h>
#define ZLIB_CONST  // input is only read
#include <zlib.h>
#include <zstd.h>

#include <algorithm>
#include <new>
#include <utility>
#include <vector>

namespace coilassay {
namespace {

/// What both formats share: packed bytes come in blocks, limits hold, the end must be a real end.
class UnpackedBytes : public ByteSource {
 public:
  UnpackedBytes(ByteSource& inner, const UnpackLimits& limits) : inner_(inner), limits_(limits), packed_(std::size_t{1} << 18U) {}

  const std::string& name() const override { return inner_.name(); }
  std::size_t size_hint() const override { return 0; }
  void stop() override { inner_.stop(); }

  Result<std::size_t> read(std::span<char> into) override {
    std::size_t done = 0;
    while (done < into.size()) {
      if (at_ == filled_ && !source_ended_) {
        const auto got = inner_.read(packed_);
        if (!got) return failure(got);
        at_ = 0;
        filled_ = *got;
        packed_bytes_ += filled_;
        source_ended_ = filled_ == 0;
      }
      if (at_ == filled_ && source_ended_ && between_frames()) break;
      const auto step = unpack(std::span(packed_).subspan(at_, filled_ - at_), into.subspan(done));
      if (!step) return failure(step);
      at_ += step->taken;
      done += step->given;
      unpacked_bytes_ += step->given;
      if (unpacked_bytes_ > limits_.most_bytes ||
          (unpacked_bytes_ > limits_.free_bytes && unpacked_bytes_ / limits_.most_ratio > packed_bytes_)) {
        return failure(Problem::damaged, name(),
                       fmt::format("{} bytes unfold to more than {}: no capture does that", packed_bytes_, unpacked_bytes_),
                       "unpack it by hand and look at it first");
      }
      if (step->taken == 0 && step->given == 0) {
        if (at_ == filled_ && source_ended_) return damaged("the packed data end too early");
        if (at_ < filled_ && between_frames()) return damaged("something that is not packed follows the packed data");
      }
    }
    return done;
  }

 protected:
  struct Step {
    std::size_t taken = 0;
    std::size_t given = 0;
  };
  virtual Result<Step> unpack(std::span<const char> packed, std::span<char> into) = 0;
  virtual bool between_frames() const = 0;

  tl::unexpected<Error> damaged(const std::string& finding) const {
    return failure(Problem::damaged, name(), finding, "copy or download the file again");
  }

 private:
  ByteSource& inner_;
  UnpackLimits limits_;
  std::vector<char> packed_;
  std::size_t at_ = 0;
  std::size_t filled_ = 0;
  std::size_t packed_bytes_ = 0;
  std::size_t unpacked_bytes_ = 0;
  bool source_ended_ = false;
};

class GzipBytes final : public UnpackedBytes {
 public:
  GzipBytes(ByteSource& inner, const UnpackLimits& limits) : UnpackedBytes(inner, limits) {
    constexpr int kGzipOnly = 16 + MAX_WBITS;
    if (::inflateInit2(&stream_, kGzipOnly) != Z_OK) throw std::bad_alloc();
  }
  ~GzipBytes() override { ::inflateEnd(&stream_); }
  GzipBytes(const GzipBytes&) = delete;
  GzipBytes& operator=(const GzipBytes&) = delete;

 private:
  bool between_frames() const override { return between_; }

  Result<Step> unpack(std::span<const char> packed, std::span<char> into) override {
    constexpr std::size_t kAtOnce = std::size_t{1} << 30U;  // zlib counts in 32 bits
    if (between_) {                                          // several members may follow each other
      while (!packed.empty() && packed.front() == '\0' && any_) {  // padding behind the last one
        ++padding_;
        packed = packed.subspan(1);
      }
      if (padding_ > 0) {
        const Step step{std::exchange(padding_, 0), 0};
        return step;
      }
      if (!packed.empty() && any_ && packed.front() != '\x1f') return Step{};
      if (!packed.empty()) {
        ::inflateReset(&stream_);
        between_ = false;
        any_ = true;
      }
    }
    stream_.next_in = reinterpret_cast<const Bytef*>(packed.data());
    stream_.avail_in = static_cast<uInt>(std::min(packed.size(), kAtOnce));
    stream_.next_out = reinterpret_cast<Bytef*>(into.data());
    stream_.avail_out = static_cast<uInt>(std::min(into.size(), kAtOnce));
    const uInt in_before = stream_.avail_in;
    const uInt out_before = stream_.avail_out;
    const int state = ::inflate(&stream_, Z_NO_FLUSH);
    if (state == Z_MEM_ERROR) throw std::bad_alloc();
    if (state != Z_OK && state != Z_STREAM_END && state != Z_BUF_ERROR) {
      return damaged(fmt::format("the packed data are damaged ({})", stream_.msg != nullptr ? stream_.msg : "gzip"));
    }
    if (state == Z_STREAM_END) between_ = true;
    return Step{in_before - stream_.avail_in, out_before - stream_.avail_out};
  }

  z_stream stream_{};
  bool between_ = true;
  bool any_ = false;
  std::size_t padding_ = 0;
};

class ZstdBytes final : public UnpackedBytes {
 public:
  ZstdBytes(ByteSource& inner, const UnpackLimits& limits) : UnpackedBytes(inner, limits), stream_(::ZSTD_createDStream()) {
    if (stream_ == nullptr) throw std::bad_alloc();
    constexpr int kLargestWindow = 26;  // 64 MiB: what the memory promise leaves
    ::ZSTD_DCtx_setParameter(stream_, ZSTD_d_windowLogMax, kLargestWindow);
  }
  ~ZstdBytes() override { ::ZSTD_freeDStream(stream_); }
  ZstdBytes(const ZstdBytes&) = delete;
  ZstdBytes& operator=(const ZstdBytes&) = delete;

 private:
  bool between_frames() const override { return between_; }

  Result<Step> unpack(std::span<const char> packed, std::span<char> into) override {
    ZSTD_inBuffer in{packed.data(), packed.size(), 0};
    ZSTD_outBuffer out{into.data(), into.size(), 0};
    const std::size_t state = ::ZSTD_decompressStream(stream_, &out, &in);
    if (::ZSTD_isError(state) != 0) {
      return damaged(fmt::format("the packed data are damaged ({})", ::ZSTD_getErrorName(state)));
    }
    if (in.pos > 0 || out.pos > 0) between_ = state == 0;
    return Step{in.pos, out.pos};
  }

  ZSTD_DStream* stream_;
  bool between_ = true;
};

}  // namespace

std::unique_ptr<ByteSource> unpacked(ByteSource& inner, std::string_view first_bytes, const UnpackLimits& limits) {
  if (first_bytes.starts_with("\x1f\x8b\x08")) return std::make_unique<GzipBytes>(inner, limits);
  if (first_bytes.starts_with("\x28\xb5\x2f\xfd")) return std::make_unique<ZstdBytes>(inner, limits);
  return nullptr;
}

}  // namespace coilassay

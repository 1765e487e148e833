#include "acquire/byte_source_text.h"

#include <fmt/format.h>
#include <utf8cpp/utf8.h>

#include <algorithm>
#include <iterator>
#include <vector>

namespace coilassay {
namespace {

class Utf16Bytes final : public ByteSource {
 public:
  Utf16Bytes(ByteSource& inner, bool big_endian) : inner_(inner), big_endian_(big_endian), raw_(std::size_t{1} << 17U) {}

  const std::string& name() const override { return inner_.name(); }
  std::size_t size_hint() const override { return inner_.size_hint() / 2; }
  void stop() override { inner_.stop(); }

  Result<std::size_t> read(std::span<char> into) override {
    std::size_t done = 0;
    while (done < into.size()) {
      if (at_ == text_.size()) {
        if (ended_) break;
        if (const auto more = convert_more(); !more) return failure(more);
        continue;
      }
      const std::size_t count = std::min(into.size() - done, text_.size() - at_);
      std::copy_n(text_.begin() + static_cast<std::ptrdiff_t>(at_), count, into.begin() + static_cast<std::ptrdiff_t>(done));
      done += count;
      at_ += count;
    }
    return done;
  }

 private:
  Result<void> convert_more() {
    text_.clear();
    at_ = 0;
    const auto got = inner_.read(std::span(raw_).subspan(left_over_));
    if (!got) return failure(got);
    const std::size_t filled = left_over_ + *got;
    ended_ = filled < raw_.size();
    const std::size_t pairs = filled / 2;
    for (std::size_t i = 0; i < pairs; ++i) {
      if (const auto done = take(unit(i)); !done) return done;
    }
    left_over_ = filled % 2;
    if (left_over_ > 0) raw_[0] = raw_[filled - 1];
    if (ended_ && (high_ != 0 || left_over_ > 0)) return damaged("the text ends within a character");
    return {};
  }

  char32_t unit(std::size_t i) const {
    const auto first = static_cast<unsigned char>(raw_[2 * i]);
    const auto second = static_cast<unsigned char>(raw_[2 * i + 1]);
    return big_endian_ ? first * 256U + second : second * 256U + first;
  }

  Result<void> take(char32_t unit) {
    const bool low = unit >= 0xDC00 && unit <= 0xDFFF;
    if (low != (high_ != 0)) return damaged("half a character (a lone surrogate) stands in this line");
    if (unit >= 0xD800 && unit <= 0xDBFF) {
      high_ = unit;
      return {};
    }
    if (low) {
      unit = 0x10000 + ((high_ - 0xD800) << 10U) + (unit - 0xDC00);
      high_ = 0;
    }
    if (unit == '\n') ++line_;
    if (unit < 0x80) {
      text_ += static_cast<char>(unit);
    } else {
      utf8::append(unit, std::back_inserter(text_));
    }
    return {};
  }

  tl::unexpected<Error> damaged(const std::string& finding) const {
    return failure(Problem::damaged, fmt::format("{}:{}", name(), line_), finding, "export the file again, as UTF-8 if possible");
  }

  ByteSource& inner_;
  bool big_endian_;
  std::vector<char> raw_;
  std::size_t left_over_ = 0;  // an odd byte at the end of what was read
  std::string text_;
  std::size_t at_ = 0;
  char32_t high_ = 0;  // first half of a pair, when its second is still to come
  std::size_t line_ = 1;
  bool ended_ = false;
};

/// Lines end with a carriage return alone.
class ReturnLines final : public ByteSource {
 public:
  explicit ReturnLines(ByteSource& inner) : inner_(inner) {}
  const std::string& name() const override { return inner_.name(); }
  std::size_t size_hint() const override { return inner_.size_hint(); }
  void stop() override { inner_.stop(); }
  Result<std::size_t> read(std::span<char> into) override {
    const auto got = inner_.read(into);
    if (got) std::replace(into.begin(), into.begin() + static_cast<std::ptrdiff_t>(*got), '\r', '\n');
    return got;
  }

 private:
  ByteSource& inner_;
};

/// Plain letters in UTF-16 have a zero as every second byte.
bool zeros_between(std::string_view bytes, std::size_t offset) {
  if (bytes.size() < 16) return false;
  std::size_t zeros = 0;
  std::size_t others = 0;
  for (std::size_t i = 0; i + 1 < bytes.size(); i += 2) {
    zeros += bytes[i + offset] == '\0' ? 1U : 0U;
    others += bytes[i + 1 - offset] == '\0' ? 1U : 0U;
  }
  return others == 0 && zeros * 10 > (bytes.size() / 2) * 9;
}

}  // namespace

TextStream as_text(ByteSource& inner, std::string_view first_bytes) {
  if (first_bytes.starts_with("\xFF\xFE") || zeros_between(first_bytes, 1)) {
    return {std::make_unique<Utf16Bytes>(inner, false), "utf-16le"};
  }
  if (first_bytes.starts_with("\xFE\xFF") || zeros_between(first_bytes, 0)) {
    return {std::make_unique<Utf16Bytes>(inner, true), "utf-16be"};
  }
  if (first_bytes.find('\r') != std::string_view::npos && first_bytes.find('\n') == std::string_view::npos &&
      first_bytes.find('\0') == std::string_view::npos) {
    return {std::make_unique<ReturnLines>(inner), {}};
  }
  return {};
}

}  // namespace coilassay

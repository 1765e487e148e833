// Compressed files and other encodings are read to the same samples; damage in them is said, and nothing unfolds for ever.
#include <gtest/gtest.h>
#include <zlib.h>
#include <zstd.h>

#include <sys/stat.h>

#include <atomic>
#include <chrono>
#include <csignal>
#include <thread>

#include "acquire/byte_source_unpack.h"
#include "base/digest.h"
#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using test::MadeFiles;

class ByteLayers : public MadeFiles {};

std::string table(int rows) {
  std::string text = "time (s),Spannung \xC2\xB5 (V)\n";
  for (int i = 0; i < rows; ++i) text += std::to_string(i) + "e-6," + std::to_string((i * 37) % 101 - 50) + "\n";
  return text;
}

std::string gzipped(const std::string& text) {
  z_stream stream{};
  EXPECT_EQ(::deflateInit2(&stream, 6, Z_DEFLATED, 16 + MAX_WBITS, 8, Z_DEFAULT_STRATEGY), Z_OK);
  std::string in = text;
  std::string out(text.size() + 1000, '\0');
  stream.next_in = reinterpret_cast<Bytef*>(in.data());
  stream.avail_in = static_cast<uInt>(in.size());
  stream.next_out = reinterpret_cast<Bytef*>(out.data());
  stream.avail_out = static_cast<uInt>(out.size());
  EXPECT_EQ(::deflate(&stream, Z_FINISH), Z_STREAM_END);
  out.resize(stream.total_out);
  ::deflateEnd(&stream);
  return out;
}

std::string zstandard(const std::string& text) {
  std::string out(::ZSTD_compressBound(text.size()), '\0');
  const std::size_t size = ::ZSTD_compress(out.data(), out.size(), text.data(), text.size(), 3);
  EXPECT_EQ(::ZSTD_isError(size), 0U);
  out.resize(size);
  return out;
}

std::string utf16(const std::string& ascii, bool big_endian, bool mark) {
  std::string out;
  const auto add = [&](unsigned unit) {
    const char high = static_cast<char>(unit >> 8U);
    const char low = static_cast<char>(unit & 0xFFU);
    out += big_endian ? high : low;
    out += big_endian ? low : high;
  };
  if (mark) add(0xFEFF);
  for (const char c : ascii) add(static_cast<unsigned char>(c));
  return out;
}

TEST_F(ByteLayers, CompressedFilesGiveTheSameSamples) {
  const std::string text = table(60000);
  const Capture plain = capture_of(text);
  for (const std::string& packed : {gzipped(text), zstandard(text), gzipped(text.substr(0, 1000)) + gzipped(text.substr(1000))}) {
    const Capture c = capture_of(packed);
    EXPECT_EQ(c.channels.at(0).samples, plain.channels.at(0).samples);
    EXPECT_EQ(c.source.sha256, sha256_of(packed));  // of the file as it is stored
    EXPECT_EQ(c.source.bytes, packed.size());
  }
}

TEST_F(ByteLayers, CompressedFilesCutShortOrDamagedAreRefused) {
  const std::string text = table(60000);
  for (const std::string& packed : {gzipped(text), zstandard(text)}) {
    EXPECT_EQ(error_of(packed.substr(0, packed.size() - 20)).problem, Problem::damaged);
    EXPECT_EQ(error_of(packed.substr(0, packed.size() / 2)).problem, Problem::damaged);
    std::string wrong = packed;
    wrong[wrong.size() / 2] = static_cast<char>(wrong[wrong.size() / 2] ^ 0x55);
    EXPECT_EQ(error_of(wrong).problem, Problem::damaged);
    EXPECT_EQ(error_of(packed + "tail").problem, Problem::damaged);
  }
}

/// Bytes from memory.
class MemoryBytes final : public ByteSource {
 public:
  explicit MemoryBytes(std::string bytes) : bytes_(std::move(bytes)) {}
  const std::string& name() const override { return name_; }
  std::size_t size_hint() const override { return 0; }
  Result<std::size_t> read(std::span<char> into) override {
    const std::size_t count = std::min(into.size(), bytes_.size() - at_);
    std::copy_n(bytes_.begin() + static_cast<std::ptrdiff_t>(at_), count, into.begin());
    at_ += count;
    return count;
  }

 private:
  std::string name_ = "memory";
  std::string bytes_;
  std::size_t at_ = 0;
};

TEST_F(ByteLayers, WhatUnfoldsWithoutEndIsStopped) {
  MemoryBytes bytes(gzipped(std::string(3'000'000, '0')));
  UnpackLimits limits;
  limits.free_bytes = 1'000'000;
  limits.most_ratio = 100;
  const auto stream = unpacked(bytes, "\x1f\x8b\x08", limits);
  ASSERT_NE(stream, nullptr);
  std::vector<char> room(4'000'000);
  const auto got = stream->read(room);
  ASSERT_FALSE(got);
  EXPECT_EQ(got.error().problem, Problem::damaged);
  EXPECT_NE(got.error().finding.find("unfold"), std::string::npos);
}

TEST_F(ByteLayers, Utf16OfBothOrdersIsRead) {
  const std::string text = "time\tCH1 (V)\r\n0\t1\r\n1\t2\r\n2\t4\r\n";
  for (const bool big_endian : {false, true}) {
    for (const bool mark : {false, true}) {
      const Capture c = capture_of(utf16(text, big_endian, mark));
      ASSERT_EQ(c.channels.size(), 1U);
      EXPECT_EQ(c.channels[0].name, "CH1");
      EXPECT_EQ(c.channels[0].samples, (std::vector<double>{1, 2, 4}));
      EXPECT_EQ(c.dialect.encoding, big_endian ? "utf-16be" : "utf-16le");
    }
  }
}

TEST_F(ByteLayers, ALoneSurrogateIsNamedWithItsLine) {
  std::string bytes = utf16("time\tCH1\n0\t1\n", false, true);
  bytes += std::string("\x00\xD8", 2) + utf16("1\t2\n", false, false);
  const Error error = error_of(bytes);
  EXPECT_EQ(error.problem, Problem::damaged);
  EXPECT_EQ(error.place, "capture.csv:3");
}

TEST_F(ByteLayers, SignsOfWindows1252AreRead) {
  const Capture c = capture_of("time (\xB5s);Temp \xB0""C\n0;1\n1;2\n2;4\n");
  EXPECT_EQ(c.time.step_s, 1e-6);
  EXPECT_EQ(c.channels.at(0).name, "Temp \xC2\xB0""C");
  EXPECT_EQ(c.dialect.encoding, "windows-1252");
}

TEST_F(ByteLayers, StrayBytesInThePreambleDoNoHarm) {
  const Capture c = capture_of("Model,b\xFF\xFE\x81nch\ntime (s),CH1 (V)\n0,1\n1,2\n2,4\n");
  EXPECT_EQ(c.channels.at(0).samples.size(), 3U);
}

TEST_F(ByteLayers, LinesThatEndWithAReturnAloneAreRead) {
  EXPECT_EQ(capture_of("time,CH1\r0,1\r1,2\r2,4\r").channels.at(0).samples, (std::vector<double>{1, 2, 4}));
}

TEST_F(ByteLayers, APipeIsReadLikeAFile) {
  const std::string text = table(200000);
  const Capture plain = capture_of(text);
  const std::string pipe = path("pipe");
  ASSERT_EQ(::mkfifo(pipe.c_str(), 0600), 0);
  std::thread writer([&] { std::ofstream(pipe, std::ios::binary) << text; });
  const auto list = captures(pipe);
  writer.join();
  ASSERT_TRUE(list) << list.error().finding;
  EXPECT_EQ(list->front().channels.at(0).samples, plain.channels.at(0).samples);
  EXPECT_EQ(list->front().source.sha256, plain.source.sha256);
}

TEST_F(ByteLayers, ADamagedPipeEndsAtOnceThoughItsWriterGoesOnWaiting) {
  const std::string pipe = path("pipe");
  ASSERT_EQ(::mkfifo(pipe.c_str(), 0600), 0);
  std::string text = table(60000);
  text.insert(text.find("\n100e-6,") + 1, "trigger lost\n");
  text += std::string(std::size_t{1} << 20U, ' ');
  std::atomic<bool> told = false;
  std::thread writer([&] {
    std::ofstream out(pipe, std::ios::binary);
    out << text << std::flush;
    while (!told && out) {  // keeps its end open until the reader has gone
      std::this_thread::sleep_for(std::chrono::milliseconds(5));
      out << ' ' << std::flush;
    }
  });
  std::signal(SIGPIPE, SIG_IGN);
  const auto list = captures(pipe);
  told = true;
  writer.join();
  EXPECT_FALSE(list);
}

}  // namespace
}  // namespace coilassay

#include "acquire/capture_writer.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <unistd.h>

#include <cmath>
#include <cstdlib>
#include <cstring>
#include <filesystem>
#include <limits>
#include <sstream>

#include "acquire/reader.h"
#include "acquire/synthetic/ring_down.h"

namespace coilassay {
namespace {

using ::testing::HasSubstr;
using ::testing::Not;

Channel channel(const std::string& name, std::vector<double> samples) {
  Channel c;
  c.name = name;
  c.unit = Unit::volt;
  c.unit_stated = true;
  c.samples = std::move(samples);
  return c;
}

std::string written(const Capture& capture) {
  std::ostringstream out;
  write_capture_csv(out, capture);
  return out.str();
}

std::vector<std::string> lines(const std::string& text) {
  std::vector<std::string> all;
  std::istringstream in(text);
  for (std::string line; std::getline(in, line);) all.push_back(line);
  return all;
}

bool same_bits(double a, double b) {
  return std::memcmp(&a, &b, sizeof a) == 0;
}

TEST(CaptureWriter, SettingsThenNamesThenSamples) {
  Capture capture;
  capture.time = {-2e-8, 2e-8, {}};
  capture.channels = {channel("CH1", {0.1, -2.5e-7, std::nan("")}), channel("CH2", {1, 2, 3})};
  capture.channels[0].full_scale = 2;
  capture.channels[0].resolution = 2.0 / 128;
  capture.channels[1].unit_stated = false;
  capture.dialect.settings = {{"coil", "drum-47"}};
  EXPECT_EQ(written(capture),
            "sample interval,2e-08,s\n"
            "start time,-2e-08,s\n"
            "CH1:full scale,2,V\n"
            "CH1:resolution,0.015625,V\n"
            "coil,drum-47\n"
            "time [s],CH1 [V],CH2\n"
            "-2e-08,0.1,1\n"
            "0,-2.5e-07,2\n"
            "2e-08,nan,3\n");
}

TEST(CaptureWriter, EverySampleReadsBackToTheSameDouble) {
  Capture capture;
  capture.time = {0, 0.1, {}};
  const std::vector<double> hard{0.1,
                                 1.0 / 3,
                                 -0.0,
                                 5e-324,
                                 std::numeric_limits<double>::min(),
                                 std::numeric_limits<double>::max(),
                                 9007199254740993.0,
                                 2.2250738585072011e-308,
                                 123456789.12345679};
  capture.channels = {channel("CH1", hard)};
  const auto rows = lines(written(capture));
  for (std::size_t n = 0; n < hard.size(); ++n) {
    const std::string& row = rows[rows.size() - hard.size() + n];
    const std::size_t comma = row.find(',');
    EXPECT_TRUE(same_bits(std::strtod(row.c_str() + comma + 1, nullptr), hard[n])) << row;
    EXPECT_TRUE(same_bits(std::strtod(row.c_str(), nullptr), static_cast<double>(n) * 0.1)) << row;
  }
}

TEST(CaptureWriter, TimeWithoutOriginOrStep) {
  Capture capture;
  capture.channels = {channel("CH1", {1, 2})};
  EXPECT_EQ(written(capture), "CH1 [V]\n1\n2\n");
  capture.time.step_s = 1e-6;
  EXPECT_EQ(written(capture), "sample interval,1e-06,s\nCH1 [V]\n1\n2\n");
  capture.time = {std::nan(""), std::nan(""), {0, 3e-6}};
  EXPECT_EQ(written(capture), "time [s],CH1 [V]\n0,1\n3e-06,2\n");
}

TEST(CaptureWriter, OutsideTextCannotBreakTheTable) {
  Capture capture;
  capture.time = {0, 1, {}};
  capture.segment = "run 1\n2,3";
  capture.channels = {channel("a,\"b\"\n1,2", {7}), channel("=1+1", {8}), channel("", {9})};
  capture.dialect.settings = {{"1", "2"}, {"note", "line\r\nbreak"}, {"sample interval", "9 s"}};
  const auto rows = lines(written(capture));
  ASSERT_EQ(rows.size(), 7U);  // no more lines than rows
  EXPECT_EQ(rows[0], "sample interval,1,s");
  EXPECT_THAT(rows[2], HasSubstr("segment"));
  EXPECT_EQ(rows[3], "# 1,2");  // not a row of samples
  EXPECT_THAT(rows[4], HasSubstr("note"));
  EXPECT_THAT(rows[5], HasSubstr("\"\"b\"\""));
  EXPECT_THAT(rows[5], HasSubstr("'=1+1"));
  EXPECT_THAT(rows[5], HasSubstr("channel 4 [V]"));
  EXPECT_EQ(rows[6], "0,7,8,9");
}

Capture read_back(const Capture& capture) {
  const std::string path =
      (std::filesystem::temp_directory_path() / ("capture_writer_test_" + std::to_string(::getpid()) + ".csv"))
          .string();
  EXPECT_TRUE(write_file(path, written(capture)));
  auto recording = read_recording(path);
  std::filesystem::remove(path);
  EXPECT_TRUE(recording) << (recording ? "" : recording.error().place + ": " + recording.error().finding);
  if (!recording) return {};
  auto* captures = std::get_if<std::vector<Capture>>(&*recording);
  EXPECT_TRUE(captures != nullptr && captures->size() == 1);
  return captures != nullptr && !captures->empty() ? captures->front() : Capture{};
}

// Time included: an interval that is no short number, a start of many steps.
TEST(CaptureWriter, TheReadersGiveTheSameCaptureBitForBit) {
  for (const int bits : {0, 8, 12}) {
    synthetic::RingDownBench bench;
    bench.samples = 5000;
    bench.noise_v = 0.01;
    bench.bits = bits;
    bench.drive_channel = true;
    bench.drive_time_s = 5e-6;
    const auto record = synthetic::simulate_ring_down(bench);
    ASSERT_TRUE(record);
    const Capture& made = record->capture;
    const Capture back = read_back(made);
    ASSERT_EQ(back.channels.size(), 2U);
    EXPECT_TRUE(back.time.uniform());
    EXPECT_TRUE(same_bits(back.time.step_s, made.time.step_s)) << back.time.step_s << " " << made.time.step_s;
    EXPECT_TRUE(same_bits(back.time.start_s, made.time.start_s)) << back.time.start_s << " " << made.time.start_s;
    for (std::size_t c = 0; c < 2; ++c) {
      const Channel &a = made.channels[c], &b = back.channels[c];
      EXPECT_EQ(b.name, a.name);
      EXPECT_EQ(b.unit, Unit::volt);
      EXPECT_TRUE(b.unit_stated);
      EXPECT_EQ(b.column, a.column);
      EXPECT_EQ(b.missing, 0U);
      ASSERT_EQ(b.samples.size(), a.samples.size());
      EXPECT_EQ(std::memcmp(a.samples.data(), b.samples.data(), a.samples.size() * sizeof(double)), 0) << bits;
      if (bits > 0) {
        EXPECT_EQ(b.full_scale, a.full_scale);
        EXPECT_NEAR(b.resolution, a.resolution, 1e-9 * a.resolution);
      } else {
        EXPECT_TRUE(std::isnan(b.full_scale));
      }
    }
    EXPECT_TRUE(back.findings.empty()) << back.findings.front().code;
    // And what was read is written the same again.
    EXPECT_EQ(written(read_back(back)), written(back)) << bits;
  }
}

TEST(CaptureWriter, MissingSamplesComeBackAsMissing) {
  Capture capture;
  capture.time = {0, 1e-6, {}};
  std::vector<double> samples(100);
  for (std::size_t n = 0; n < samples.size(); ++n) samples[n] = std::sin(0.3 * static_cast<double>(n));
  samples[7] = samples[8] = std::nan("");
  capture.channels = {channel("CH1", samples)};
  const Capture back = read_back(capture);
  ASSERT_EQ(back.channels.size(), 1U);
  EXPECT_EQ(back.channels[0].missing, 2U);
  EXPECT_TRUE(std::isnan(back.channels[0].samples.at(7)));
}

}  // namespace
}  // namespace coilassay

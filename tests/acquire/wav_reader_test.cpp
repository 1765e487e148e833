// Sound-card recordings. The files in data/ were written by another program (sox 14.4.2), and are taken apart here byte
// by byte after the RIFF layout, so that neither the reader nor its library is its own witness.
#include <gtest/gtest.h>

#include <cmath>

#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using test::bytes_of;
using test::found;
using test::MadeFiles;

class WavReader : public MadeFiles {};

/// The samples behind the chunk "data", as fractions of full scale.
std::vector<double> taken_apart(const std::string& bytes, std::size_t bytes_per_sample) {
  const std::size_t data = bytes.find("data") + 8;
  std::vector<double> samples;
  for (std::size_t at = data; at + bytes_per_sample <= bytes.size(); at += bytes_per_sample) {
    std::int64_t value = 0;
    for (std::size_t i = bytes_per_sample; i-- > 0;) value = value * 256 + static_cast<unsigned char>(bytes[at + i]);
    const std::int64_t range = std::int64_t{1} << (8 * bytes_per_sample);
    if (value >= range / 2) value -= range;
    samples.push_back(static_cast<double>(value) / (static_cast<double>(range) / 2));
  }
  return samples;
}

TEST_F(WavReader, TakesBothChannelsAsFractionsOfFullScale) {
  const std::string file = "tests/acquire/data/sound-card-two-channels.wav";
  const auto list = captures(file);
  ASSERT_TRUE(list) << list.error().finding;
  const Capture& c = list->front();
  ASSERT_EQ(c.channels.size(), 2U);
  const std::vector<double> expected = taken_apart(bytes_of(file), 2);
  ASSERT_EQ(c.samples() * 2, expected.size());
  for (std::size_t i = 0; i < c.samples(); ++i) {
    ASSERT_EQ(c.channels[0].samples[i], expected[2 * i]);
    ASSERT_EQ(c.channels[1].samples[i], expected[2 * i + 1]);
  }
  EXPECT_EQ(c.time.step_s, 1.0 / 48000);
  EXPECT_TRUE(std::isnan(c.time.start_s));
  EXPECT_EQ(c.channels[0].full_scale, 1.0);
  EXPECT_EQ(c.channels[0].resolution, 1.0 / 32768);
  EXPECT_EQ(c.channels[1].column, 2U);
  EXPECT_EQ(c.dialect.format, "wav");
}

TEST_F(WavReader, Takes24Bits) {
  const std::string file = "tests/acquire/data/sound-card-24-bit.wav";
  const auto list = captures(file);
  ASSERT_TRUE(list) << list.error().finding;
  EXPECT_EQ(list->front().channels[0].samples, taken_apart(bytes_of(file), 3));
  EXPECT_EQ(list->front().channels[0].resolution, std::ldexp(1.0, -23));
}

TEST_F(WavReader, SaysThatAFileWasCutShort) {
  const std::string bytes = bytes_of("tests/acquire/data/sound-card-two-channels.wav");
  const auto list = captures(made("cut.wav", bytes.substr(0, bytes.size() - 100)));
  ASSERT_TRUE(list) << list.error().finding;
  EXPECT_NE(found(list->front(), "header_contradicts"), nullptr);
}

TEST_F(WavReader, RefusesAHeadWithoutSamples) {
  const std::string bytes = bytes_of("tests/acquire/data/sound-card-two-channels.wav");
  EXPECT_FALSE(captures(made("head.wav", bytes.substr(0, 40))));
  EXPECT_FALSE(captures(made("short.wav", bytes.substr(0, 12))));
  std::string wrong = bytes;
  wrong[20] = 99;  // a coding nobody knows
  EXPECT_FALSE(captures(made("wrong.wav", wrong)));
}

}  // namespace
}  // namespace coilassay

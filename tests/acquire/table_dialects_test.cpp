// One decaying wave of 48 samples, exported in every dialect under data/: always the same samples at the same times.
// What is special about a file is in its name; damaged copies of each are made here.
#include <fmt/format.h>
#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using test::bytes_of;
using test::found;
using test::MadeFiles;

constexpr std::size_t kSamples = 48;

/// 40 mV codes, as the files hold them; written down again, not taken from the reader.
double volts(std::size_t i) {
  const auto n = static_cast<double>(i);
  return std::nearbyint(5.0 * std::exp(-n / 20) * std::cos(2 * std::numbers::pi * n / 12) / 0.04) * 0.04;
}

struct Dialect {
  const char* file;
  const char* channel;
  Unit unit;
  double start_s = -1.6e-6;
  const char* finding = nullptr;
  const char* encoding = "utf-8";
};

const Dialect kDialects[] = {
    {"names-and-numbers.csv", "CH1", Unit::volt},
    {"names-units-rows.csv", "1", Unit::volt},
    {"ms-semicolon-comma-blank-third.csv", "Channel A", Unit::volt},
    {"preamble-key-value.csv", "CH1", Unit::volt},
    {"channel-keys.csv", "CH1", Unit::volt},
    {"settings-beside-the-data.csv", "CH1", Unit::volt},
    {"start-increment-over-row-two.csv", "CH1", Unit::volt},
    {"row-index-and-rate.csv", "CH1", Unit::volt, std::nan("")},
    {"one-column-and-period.txt", "CH1", Unit::volt, std::nan("")},
    {"begin-end.txt", "CH1", Unit::one},
    {"engineering-exponents.csv", "CH1", Unit::volt},
    {"suffixes.txt", "v(coil)", Unit::volt},
    {"thousands-parted.csv", "CH1", Unit::volt},
    {"quoted-and-trailing.csv", "CH1", Unit::volt},
    {"utf16-little-endian-tab.txt", "CH1", Unit::volt, -1.6e-6, nullptr, "utf-16le"},
    {"latin-1-signs.csv", "Spule 45\xC2\xB0", Unit::volt, -1.6e-6, nullptr, "windows-1252"},
    {"blanks-in-columns.txt", "CH1", Unit::volt},
    {"heading-says-us.csv", "CH1", Unit::volt, -1.6e-6, "header_contradicts"},
    {"interval-before-decimation.csv", "CH1", Unit::volt, -1.6e-6, "header_contradicts"},
};

class TableDialects : public MadeFiles {
 protected:
  static std::string data(const std::string& name) { return "tests/acquire/data/" + name; }
};

TEST_F(TableDialects, GiveTheSameWave) {
  for (const Dialect& d : kDialects) {
    SCOPED_TRACE(d.file);
    const auto list = captures(data(d.file));
    ASSERT_TRUE(list) << list.error().place << ": " << list.error().finding;
    ASSERT_EQ(list->size(), 1U);
    const Capture& c = list->front();
    ASSERT_EQ(c.samples(), kSamples);
    EXPECT_EQ(c.channels[0].name, d.channel);
    EXPECT_EQ(c.channels[0].unit, d.unit);
    for (std::size_t i = 0; i < kSamples; ++i) ASSERT_NEAR(c.channels[0].samples[i], volts(i), 1e-9) << "sample " << i;
    ASSERT_TRUE(c.time.uniform());
    EXPECT_EQ(c.time.step_s, 2e-7);
    if (std::isnan(d.start_s)) {
      EXPECT_TRUE(std::isnan(c.time.start_s));
    } else {
      EXPECT_EQ(c.time.start_s, d.start_s);
    }
    EXPECT_NEAR(c.channels[0].resolution, 0.04, 1e-12);
    EXPECT_EQ(c.dialect.encoding, d.encoding);
    if (d.finding != nullptr) {
      EXPECT_NE(found(c, d.finding), nullptr);
    } else {
      EXPECT_TRUE(c.findings.empty()) << c.findings.front().code << ": " << c.findings.front().message;
    }
  }
}

TEST_F(TableDialects, WhatIsOverRangeOrAbsentIsMissing) {
  const auto list = captures(data("over-range-and-gaps.csv"));
  ASSERT_TRUE(list);
  const Channel& channel = list->front().channels[0];
  EXPECT_EQ(channel.missing, 8U);
  for (const std::size_t i : {3U, 9U, 10U, 11U, 15U, 20U, 21U, 22U}) EXPECT_TRUE(std::isnan(channel.samples[i])) << i;
  EXPECT_NEAR(channel.samples[12], volts(12), 1e-9);
  const Finding* finding = found(list->front(), "missing_samples");
  ASSERT_NE(finding, nullptr);
  EXPECT_NE(finding->message.find("5 of them because the instrument was over range"), std::string::npos);
}

TEST_F(TableDialects, PairsOfPeakDetectionAreNoSamples) {
  const auto list = captures(data("peak-detect-pairs.csv"));
  ASSERT_TRUE(list);
  const Finding* finding = found(list->front(), "envelope_export");
  ASSERT_NE(finding, nullptr);
  EXPECT_EQ(finding->figure, 2e-7);  // between distinct times
  EXPECT_EQ(list->front().samples(), kSamples);
  EXPECT_EQ(list->front().time.times_s.size(), kSamples);
}

TEST_F(TableDialects, SegmentsAndRunsAreKeptApart) {
  const auto segments = captures(data("segments-restart.csv"));
  ASSERT_TRUE(segments) << segments.error().finding;
  ASSERT_EQ(segments->size(), 3U);
  for (std::size_t i = 0; i < kSamples; ++i) {
    EXPECT_NEAR((*segments)[i / 16].channels[0].samples[i % 16], volts(i), 1e-9);
  }
  const auto runs = captures(data("simulator-runs.txt"));
  ASSERT_TRUE(runs) << runs.error().finding;
  ASSERT_EQ(runs->size(), 2U);
  EXPECT_EQ((*runs)[1].segment, "Step Information: Rload=2K  (Run: 2/2)");
  EXPECT_FALSE((*runs)[0].time.uniform());
  EXPECT_NE(found((*runs)[0], "uneven_step"), nullptr);
}

TEST_F(TableDialects, StampsThatLostTheirDigitsGiveNoStep) {
  const auto list = captures(data("time-that-lost-digits.csv"));
  ASSERT_TRUE(list);
  EXPECT_TRUE(std::isnan(list->front().time.step_s));
  EXPECT_NE(found(list->front(), "uneven_step"), nullptr);
  const auto stated = captures(data("time-with-repeated-stamps.csv"));
  ASSERT_TRUE(stated);
  EXPECT_EQ(stated->front().time.step_s, 2e-7);  // the stamps agree with what is stated
  EXPECT_EQ(found(stated->front(), "uneven_step"), nullptr);
}

/// Bytes of a dialect in UTF-16 are doubled: damage is put in by the same means.
std::string wide(const std::string& ascii, const Dialect& d) {
  if (std::string_view(d.encoding) != "utf-16le") return ascii;
  std::string out;
  for (const char c : ascii) out += {c, '\0'};
  return out;
}

std::vector<std::string> lines(const std::string& bytes, const std::string& end) {
  std::vector<std::string> list;
  for (std::size_t from = 0; from < bytes.size();) {
    std::size_t to = bytes.find(end, from);
    to = to == std::string::npos ? bytes.size() : to + end.size();
    list.push_back(bytes.substr(from, to - from));
    from = to;
  }
  return list;
}

std::string joined(const std::vector<std::string>& list) {
  std::string out;
  for (const std::string& line : list) out += line;
  return out;
}

// Each dialect is damaged in its fortieth line: the place must be named, whatever the dialect.
TEST_F(TableDialects, DamageInTheMiddleIsNamedWithItsLine) {
  for (const Dialect& d : kDialects) {
    SCOPED_TRACE(d.file);
    const auto good = lines(bytes_of(data(d.file)), wide("\n", d));
    ASSERT_GT(good.size(), 45U);
    const auto expect_at_40 = [&](std::vector<std::string> damaged, const char* what) {
      const Error error = error_of(joined(damaged));
      EXPECT_EQ(error.problem, Problem::damaged) << what << ": " << error.finding;
      EXPECT_EQ(error.place, "capture.csv:40") << what << ": " << error.finding;
    };
    auto damaged = good;
    damaged[39] = wide("trigger lost\n", d);
    expect_at_40(damaged, "a row of text");
    damaged = good;
    damaged[39] = wide("12.x5\n", d);
    expect_at_40(damaged, "a number that is none");
    if (std::string_view(d.file) != "one-column-and-period.txt") {
      damaged[39] = wide("0\n", d);
      expect_at_40(damaged, "a row of one cell");
    }
    damaged = good;
    damaged[39] = good[39] + wide("\0", d);
    damaged[39].insert(damaged[39].size() / 2 / 2 * 2, std::string(d.encoding == std::string_view("utf-16le") ? 2 : 1, '\0'));
    const Error nul = error_of(joined(damaged));
    EXPECT_TRUE(nul.problem == Problem::damaged || nul.problem == Problem::not_a_capture) << nul.finding;
  }
}

TEST_F(TableDialects, ARepeatedHeadingInTheMiddleIsDamage) {
  for (const char* file : {"names-and-numbers.csv", "preamble-key-value.csv", "engineering-exponents.csv"}) {
    auto list = lines(bytes_of(data(file)), "\n");
    const auto heading = std::find_if(list.begin(), list.end(), [](const std::string& l) { return l.find("CH1") != std::string::npos; });
    list.insert(list.begin() + 39, *heading);
    const Error error = error_of(joined(list));
    EXPECT_EQ(error.problem, Problem::damaged) << file << error.finding;
    EXPECT_EQ(error.place, "capture.csv:40");
  }
}

// What is left of a number may still be one: it has fewer digits than those above it.
TEST_F(TableDialects, AFileCutInMidRowIsSeen) {
  for (const Dialect& d : kDialects) {
    SCOPED_TRACE(d.file);
    if (std::string_view(d.file) == "thousands-parted.csv") continue;  // whole numbers of any length: nothing shows it
    auto list = lines(bytes_of(data(d.file)), wide("\n", d));
    if (std::string_view(d.file) == "begin-end.txt") list.pop_back();
    std::string cut = joined(list);
    const std::size_t unit = wide("x", d).size();
    while (cut[cut.size() - unit] < '0' || cut[cut.size() - unit] > '9') cut.resize(cut.size() - unit);
    cut.resize(cut.size() - unit);
    const auto got = captures(made("cut.csv", cut));
    if (got) {
      EXPECT_NE(found(got->front(), "header_contradicts"), nullptr) << "was read without a word";
    } else {
      EXPECT_EQ(got.error().problem, Problem::damaged) << got.error().finding;
    }
  }
}

TEST_F(TableDialects, AColumnDroppedFromHereOnIsNamed) {
  auto list = lines(bytes_of(data("names-and-numbers.csv")), "\n");
  for (std::size_t i = 30; i < list.size(); ++i) list[i] = list[i].substr(0, list[i].rfind(',')) + "\n";
  const Error error = error_of(joined(list));
  EXPECT_EQ(error.problem, Problem::damaged);
  EXPECT_EQ(error.place, "capture.csv:31");
}

TEST_F(TableDialects, ALostMinusSignOfTimeIsNotTakenForASegment) {
  auto list = lines(bytes_of(data("names-and-numbers.csv")), "\n");
  list[3].erase(0, 1);  // -1.2e-6 becomes 1.2e-6: time jumps forward and falls back
  const auto got = captures(made("sign.csv", joined(list)));
  if (got) {
    EXPECT_TRUE(got->size() > 1 || !got->front().time.uniform());  // never a clean record
  }
}

TEST_F(TableDialects, AMillionColumnsAreRefused) {
  std::string text;
  for (int row = 0; row < 3; ++row) {
    for (int c = 0; c < 1000000; ++c) text += "1,";
    text += "1\n";
  }
  EXPECT_EQ(error_of(text).problem, Problem::not_a_capture);
  std::string few = "1";
  for (int c = 0; c < 5000; ++c) few += ",1";
  EXPECT_EQ(error_of(few + "\n" + few + "\n").problem, Problem::not_a_capture);
}

}  // namespace
}  // namespace coilassay

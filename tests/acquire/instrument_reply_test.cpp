// What replies say: values, units, codes, blocks.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "acquire/instrument/block.h"
#include "acquire/instrument/byte_log.h"
#include "acquire/instrument/reply_values.h"
#include "acquire/instrument/row_file.h"
#include "tests/support/instrument_bench.h"
#include "tests/support/program.h"

namespace coilassay {
namespace {

using testing::ElementsAre;
using testing::HasSubstr;

ReadingSetup setup_of(const std::string& keys) {
  return *test::parsed_profile("[link]\nkind = \"tcp\"\nport = \"localhost:1\"\n[reading]\nask = \"?\"\n" + keys).reading;
}
const std::string kTwo = "fields = [\"L_s [uH]\", \"R_s [ohm]\", \"status\"]\n";

TEST(Reply, ValuesAreTurnedIntoSi) {
  const auto reading = parse_reading(setup_of(kTwo), "+4.70200E+01, 3.5e-1,0\r", "port");
  ASSERT_TRUE(reading) << reading.error().finding;
  EXPECT_DOUBLE_EQ(reading->values[0].value, 47.02e-6);
  EXPECT_NEAR(reading->values[0].resolution, 1e-4 * 1e-6, 1e-16) << "five digits behind the point, times ten, microhenry";
  EXPECT_DOUBLE_EQ(reading->values[1].value, 0.35);
  EXPECT_TRUE(reading->good());
}

// A zero with an exponent beyond all numbers is a zero, of no known resolution.
TEST(Reply, AnExponentBeyondAllNumbersDoesNoHarm) {
  const auto reading = parse_reading(setup_of(kTwo), "0E3537322222222222222222222222222222222222222222222225,0.35,0", "port");
  ASSERT_TRUE(reading) << reading.error().finding;
  EXPECT_EQ(reading->values[0].value, 0);
  EXPECT_TRUE(std::isnan(reading->values[0].resolution));
}

TEST(Reply, AValueMayBringItsOwnUnit) {
  const auto reading = parse_reading(setup_of("separator = \"space\"\nfields = [\"L_s [H]\", \"R_s [ohm]\"]\n"), " 47.02uH   350mΩ ", "port");
  ASSERT_TRUE(reading) << reading.error().finding;
  EXPECT_DOUBLE_EQ(reading->values[0].value, 47.02e-6);
  EXPECT_NEAR(reading->values[0].resolution, 1e-8, 1e-14);
  EXPECT_DOUBLE_EQ(reading->values[1].value, 0.35);
  const auto wrong = parse_reading(setup_of("separator = \"space\"\nfields = [\"L_s [H]\", \"R_s [ohm]\"]\n"), "47.02uF 350m", "port");
  ASSERT_FALSE(wrong);
  EXPECT_THAT(wrong.error().finding, HasSubstr("L_s is not an inductance"));
}

TEST(Reply, PatternsTakeLabelledLinesApart) {
  const auto reading = parse_reading(setup_of("fields = [\"L_s [uH]\", \"R_s [ohm]\"]\npattern = \"L=(\\\\S+) uH R=(\\\\S+)\"\n"), "# 17 L=47.02 uH R=0.35", "port");
  ASSERT_TRUE(reading) << reading.error().finding;
  EXPECT_DOUBLE_EQ(reading->values[0].value, 47.02e-6);
  EXPECT_FALSE(parse_reading(setup_of("fields = [\"L_s [uH]\"]\npattern = \"L=(\\\\S+)\"\n"), "C=1", "port"));
}

TEST(Reply, DecimalCommaWhereStated) {
  const ReadingSetup comma = setup_of("fields = [\"L_s [uH]\", \"R_s [ohm]\"]\nseparator = \";\"\ndecimal = \",\"\n");
  const auto reading = parse_reading(comma, "47,02;0,35", "port");
  ASSERT_TRUE(reading);
  EXPECT_DOUBLE_EQ(reading->values[0].value, 47.02e-6);
  EXPECT_FALSE(parse_reading(comma, "47.02;0,35", "port"));
}

// The codes of SCPI-99 for infinity and not-a-number, from memory, in every notation instruments write them in.
TEST(Reply, OverRangeAndNotANumberAreNoValues) {
  for (const char* code : {"9.9E37", "+9.90000E+37", "-9.9E37", "9.91E+37", "OL", "ol", "OVERLOAD", "inf", "NaN", "99e36"}) {
    const auto reading = parse_reading(setup_of(kTwo), std::string(code) + ",0.35,0", "port");
    ASSERT_TRUE(reading) << code;
    EXPECT_EQ(reading->values[0].state, ValueState::over_range) << code;
    EXPECT_TRUE(std::isnan(reading->values[0].value)) << code;
    EXPECT_FALSE(reading->good());
  }
  const ReadingSetup more = setup_of(kTwo + "invalid = [\"----\", \"1E9\"]\n");
  for (const char* code : {"----", "1000000000", "+1.0E+09"}) {
    EXPECT_EQ(parse_reading(more, std::string(code) + ",0.35,0", "port")->values[0].state, ValueState::over_range) << code;
  }
  EXPECT_EQ(parse_reading(more, "1E8,0.35,0", "port")->values[0].state, ValueState::measured);
}

TEST(Reply, AStatusThatIsNotTheGoodOneIsNoted) {
  EXPECT_TRUE(parse_reading(setup_of(kTwo), "47,0.35,+0", "port")->status_ok);
  const auto reading = parse_reading(setup_of(kTwo), "47,0.35,4", "port");
  ASSERT_TRUE(reading);
  EXPECT_FALSE(reading->status_ok);
  EXPECT_EQ(reading->status, "4");
}

TEST(Reply, WhatIsGarbledIsRefusedAndNeverMended) {
  for (const char* line : {"", "47.02", "47.02,0.35", "47.02,0.35,0,0", "4\x01" "7.02,0.35,0", "47.0\xb2,0.35,0", "47.02,,0", "4 7.02,0.35,0",
                           "47..02,0.35,0", "47.02uF,0.35,0", "\x1b[31m47,0.35,0"}) {
    const auto reading = parse_reading(setup_of(kTwo), line, "port");
    ASSERT_FALSE(reading) << line;
    EXPECT_EQ(reading.error().problem, Problem::instrument);
    for (const char c : reading.error().finding) EXPECT_GE(static_cast<unsigned char>(c), 0x20) << "control characters are never echoed";
  }
}

// IEEE 488.2, 8.7.9 (from memory): <#><count of digits><number of bytes><bytes>. The examples are computed by hand.
TEST(Block, HeadersAreReadAsTheStandardWritesThem) {
  BlockHeader header;
  EXPECT_EQ(read_block_header("#15ABCDE", header), HeaderState::complete);
  EXPECT_EQ(header.header_bytes, 3u);
  EXPECT_EQ(header.payload_bytes, 5u);
  EXPECT_EQ(read_block_header("#3005ABCDE", header), HeaderState::complete);
  EXPECT_EQ(header.payload_bytes, 5u);
  EXPECT_EQ(read_block_header("#41", header), HeaderState::needs_more);
  EXPECT_EQ(read_block_header("", header), HeaderState::needs_more);
  EXPECT_EQ(read_block_header("#", header), HeaderState::needs_more);
  EXPECT_EQ(read_block_header("#0ABC\n", header), HeaderState::no_block);
  EXPECT_EQ(read_block_header("1.5", header), HeaderState::no_block);
  EXPECT_EQ(read_block_header("#2x5", header), HeaderState::no_block);
}

TEST(Block, SamplesInBothByteOrders) {
  using Format = RecordSetup::Format;
  EXPECT_THAT(raw_samples(std::string("\x7f\x80\xff", 3), Format::int8, true), ElementsAre(127, -128, -1));
  EXPECT_THAT(raw_samples(std::string("\x01\x02\xff\xfe", 4), Format::int16, true), ElementsAre(258, -2));
  EXPECT_THAT(raw_samples(std::string("\x02\x01\xfe\xff", 4), Format::int16, false), ElementsAre(258, -2));
  // IEEE 754: 1.5 is 3FC00000, -2 is C0000000.
  EXPECT_THAT(raw_samples(std::string("\x3f\xc0\x00\x00\xc0\x00\x00\x00", 8), Format::float32, true), ElementsAre(1.5, -2));
  EXPECT_THAT(raw_samples(std::string("\x00\x00\xc0\x3f\x00\x00\x00\xc0", 8), Format::float32, false), ElementsAre(1.5, -2));
}

TEST(ByteLog, EscapesReadBackToTheSameBytes) {
  std::string all;
  for (int c = 0; c < 256; ++c) all += static_cast<char>(c);
  bool fine = true;
  EXPECT_EQ(unescaped_bytes(escaped_bytes(all), fine), all);
  EXPECT_TRUE(fine);
  unescaped_bytes("\\q", fine);
  EXPECT_FALSE(fine);
}

TEST(ByteLog, BeginsANewFileWhenItIsFullAndKeepsOneOlder) {
  const test::TemporaryFolder folder;
  const std::string path = folder / "talk.trace";
  const auto log = ByteLog::begin(path, "a trace", 2000);
  ASSERT_TRUE(log);
  for (int i = 0; i < 200; ++i) (*log)->sent("question " + std::to_string(i) + "\n");
  const std::string now = test::contents_of(path), older = test::contents_of(path + ".1");
  EXPECT_LE(now.size(), 2000u);
  EXPECT_LE(older.size(), 2000u);
  EXPECT_THAT(now, HasSubstr("question 199\\n"));
  EXPECT_THAT(now, testing::StartsWith("# a trace"));
  EXPECT_THAT(older, testing::Not(HasSubstr("question 199")));
  EXPECT_FALSE(ByteLog::begin("/no/such/folder/x", "a trace"));
}

TEST(RowFile, IsNewAndHoldsWholeRows) {
  const test::TemporaryFolder folder;
  auto file = RowFile::create(folder / "run.csv");
  ASSERT_TRUE(file);
  ASSERT_TRUE(file->append("1,2\n"));
  EXPECT_EQ(test::contents_of(folder / "run.csv"), "1,2\n") << "there without being closed";
  const auto again = RowFile::create(folder / "run.csv");
  ASSERT_FALSE(again);
  EXPECT_THAT(again.error().finding, HasSubstr("not overwritten"));
  EXPECT_FALSE(RowFile::create("/no/such/folder/run.csv"));
}

}  // namespace
}  // namespace coilassay

// The shapes of table a capture comes in, each read to the same samples.
#include <fmt/format.h>
#include <gtest/gtest.h>

#include <cmath>

#include "base/digest.h"
#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using test::found;
using test::MadeFiles;

class TableReader : public MadeFiles {};

TEST_F(TableReader, ReadsAPlainTable) {
  const Capture c = capture_of("0.0,1.5\n1e-6,-2.5\n2e-6,0.25\n3e-6,1\n");
  ASSERT_EQ(c.channels.size(), 1U);
  EXPECT_EQ(c.channels[0].samples, (std::vector<double>{1.5, -2.5, 0.25, 1}));
  EXPECT_EQ(c.channels[0].column, 2U);
  EXPECT_FALSE(c.channels[0].unit_stated);
  EXPECT_TRUE(c.time.uniform());
  EXPECT_EQ(c.time.step_s, 1e-6);
  EXPECT_EQ(c.time.start_s, 0.0);
  EXPECT_EQ(c.dialect.delimiter, ",");
  EXPECT_EQ(c.dialect.first_data_line, 1U);
  EXPECT_TRUE(c.findings.empty());
}

TEST_F(TableReader, TakesNamesAndUnitsFromTheHeading) {
  const Capture c = capture_of("time [us],CH1 (mV),CH2 [A],label_V,plain\n-1,500,1,2,3\n0,600,1,2,3\n1,700,1,2,3\n");
  ASSERT_EQ(c.channels.size(), 4U);
  EXPECT_EQ(c.channels[0].name, "CH1");
  EXPECT_EQ(c.channels[0].unit, Unit::volt);
  EXPECT_EQ(c.channels[0].samples, (std::vector<double>{0.5, 0.6, 0.7}));
  EXPECT_EQ(c.channels[1].unit, Unit::ampere);
  EXPECT_EQ(c.channels[2].name, "label_V");
  EXPECT_EQ(c.channels[2].unit, Unit::volt);
  EXPECT_EQ(c.channels[3].unit, Unit::one);
  EXPECT_FALSE(c.channels[3].unit_stated);
  EXPECT_EQ(c.time.start_s, -1e-6);
  EXPECT_EQ(c.time.step_s, 1e-6);
}

TEST_F(TableReader, TakesUnitsFromARowOfTheirOwn) {
  const Capture c = capture_of("Time,Channel A\n(ms),(V)\n\n0.00,1\n0.02,2\n0.04,3\n");
  EXPECT_EQ(c.channels[0].name, "Channel A");
  EXPECT_EQ(c.channels[0].unit, Unit::volt);
  EXPECT_EQ(c.time.step_s, 2e-5);
}

TEST_F(TableReader, ReadsDecimalCommasBetweenSemicolons) {
  const Capture c = capture_of("Zeit (ms);Kanal 1 (V)\r\n0,5;1,25\r\n1,0;-2,5E-1\r\n1,5;3\r\n");
  EXPECT_EQ(c.channels[0].samples, (std::vector<double>{1.25, -0.25, 3}));
  EXPECT_EQ(c.channels[0].name, "Kanal 1");
  EXPECT_EQ(c.time.step_s, 0.5e-3);
  EXPECT_EQ(c.dialect.decimal, ",");
  EXPECT_EQ(c.dialect.delimiter, ";");
}

TEST_F(TableReader, ReadsTabsAndBlanks) {
  for (const std::string text : {"t\tCH1\n0\t1.5\n0.1\t2.5\n0.2\t3.5\n", "t CH1\n  0   1.5\n  0.1 2.5\n  0.2 3.5\n",
                                 "t, CH1\n 0, 1.5\n 0.1, 2.5\n 0.2, 3.5\n", "\xEF\xBB\xBFt,CH1\n0,1.5\n0.1,2.5\n0.2,3.5"}) {
    const Capture c = capture_of(text);
    ASSERT_EQ(c.channels.size(), 1U) << text;
    EXPECT_EQ(c.channels[0].name, "CH1");
    EXPECT_EQ(c.channels[0].samples, (std::vector<double>{1.5, 2.5, 3.5}));
    EXPECT_EQ(c.time.step_s, 0.1);
  }
}

TEST_F(TableReader, TakesIntervalAndStartFromThePreamble) {
  const Capture c = capture_of(
      "Model,bench scope\nSample Interval,4.0,ns\nStart Time,-1e-6,s\nRecord Length,3\nFull Scale,5 V\nCH1 (V)\n0.5\n0.25\n-0.5\n");
  ASSERT_EQ(c.channels.size(), 1U);
  EXPECT_EQ(c.channels[0].name, "CH1");
  EXPECT_EQ(c.time.step_s, 4e-9);
  EXPECT_EQ(c.time.start_s, -1e-6);
  EXPECT_EQ(c.channels[0].full_scale, 5.0);
  EXPECT_EQ(c.dialect.settings.at("Model"), "bench scope");
  EXPECT_EQ(c.dialect.first_data_line, 7U);
  EXPECT_EQ(found(c, "header_contradicts"), nullptr);
}

TEST_F(TableReader, TakesStartAndIncrementFromHeadingsBesideTheColumns) {
  const Capture c = capture_of("X,CH1,Start,Increment,\nSequence,Volt,-3.0e-03,2.0e-06\n0,1.2e-2,,\n1,1.4e-2,,\n2,1.6e-2,,\n");
  ASSERT_EQ(c.channels.size(), 1U);
  EXPECT_EQ(c.channels[0].name, "CH1");
  EXPECT_EQ(c.channels[0].unit, Unit::volt);
  EXPECT_EQ(c.time.step_s, 2e-6);
  EXPECT_EQ(c.time.start_s, -3e-3);
}

TEST_F(TableReader, LeavesTimeUnknownWhenOnlyRowsAreCounted) {
  const Capture c = capture_of("index,CH1 (V)\n0,0.5\n1,0.25\n2,0.125\n");
  ASSERT_EQ(c.channels.size(), 1U);
  EXPECT_TRUE(std::isnan(c.time.step_s));
  EXPECT_TRUE(std::isnan(c.time.start_s));
  ReadOptions options;
  options.sample_interval_s = 1e-6;
  EXPECT_EQ(capture_of("index,CH1 (V)\n0,0.5\n1,0.25\n2,0.125\n", options).time.step_s, 1e-6);
}

TEST_F(TableReader, TakesASamplingRateForAnInterval) {
  EXPECT_EQ(capture_of("# Sample Rate: 50 MSa/s\nCH1 (V)\n0.5\n0.25\n0.125\n").time.step_s, 1 / 50e6);
}

TEST_F(TableReader, CountsMissingSamplesAndNeverMakesThemZero) {
  const Capture c = capture_of("t,a,b\n0,1,OL\n1e-3,,5\n2e-3,nan,-inf\n3e-3,4,9.9E37\n");
  EXPECT_EQ(c.channels[0].missing, 2U);
  EXPECT_TRUE(std::isnan(c.channels[0].samples[1]));
  EXPECT_EQ(c.channels[1].missing, 3U);
  ASSERT_NE(found(c, "missing_samples"), nullptr);
  EXPECT_EQ(found(c, "missing_samples")->figure, 2.0);
}

TEST_F(TableReader, DigestsTheBytesOfTheFile) {
  const std::string bytes = "t,a\n0,1\n1,2\n";
  const Capture c = capture_of(bytes);
  EXPECT_EQ(c.source.sha256, sha256_of(bytes));
  EXPECT_EQ(c.source.bytes, bytes.size());
  EXPECT_TRUE(c.source.name.ends_with("capture.csv"));
}

TEST_F(TableReader, ReadsAcrossBlocksOfAnyLength) {
  std::string text = "time (s),CH1 (V)\n";
  std::vector<double> expected;
  for (int i = 0; i < 150000; ++i) {
    const std::string volts = fmt::format("{:.6f}", std::sin(i * 0.01));
    text += fmt::format("{:.8e},{}\n", -1e-3 + i * 4e-9, volts);
    expected.push_back(std::strtod(volts.c_str(), nullptr));
  }
  const Capture c = capture_of(text);
  EXPECT_EQ(c.channels[0].samples, expected);
  EXPECT_EQ(c.time.step_s, 4e-9);
  EXPECT_EQ(c.time.start_s, -1e-3);
}

TEST_F(TableReader, AReadingKeyNamesTheColumns) {
  ReadOptions key;
  key.columns = {"time [us]", "V [mV]", "-", "I [A]"};
  const Capture c = capture_of("0,1,2,3\n1,2,3,4\n2,4,5,6\n", key);
  ASSERT_EQ(c.channels.size(), 2U);
  EXPECT_EQ(c.channels[0].name, "V");
  EXPECT_EQ(c.channels[0].samples, (std::vector<double>{1e-3, 2e-3, 4e-3}));
  EXPECT_EQ(c.channels[1].column, 4U);
  EXPECT_EQ(c.time.step_s, 1e-6);
}

TEST_F(TableReader, AFileThatNoLongerFitsItsReadingKeyIsRefused) {
  ReadOptions key;
  key.columns = {"time [s]", "CH1 [V]"};
  EXPECT_EQ(capture_of("time,CH1\n0,1\n1,2\n2,4\n", key).channels.at(0).unit, Unit::volt);
  const Error other_name = error_of("time,CH2\n0,1\n1,2\n", key);
  EXPECT_EQ(other_name.problem, Problem::missing_column);
  EXPECT_NE(other_name.finding.find("CH2"), std::string::npos);
  EXPECT_EQ(error_of("time,CH1,CH2\n0,1,1\n1,2,2\n", key).problem, Problem::missing_column);
}

TEST_F(TableReader, LinesMayBeSkipped) {
  ReadOptions key;
  key.skip = 2;
  EXPECT_EQ(capture_of("1,2\n3,4\ntime,CH1\n0,1\n1,2\n2,4\n", key).samples(), 3U);
}

TEST_F(TableReader, TheResultDoesNotDependOnTheThreads) {
  std::string text = "time (s),CH1 (V),CH2 (V)\n";
  for (int i = 0; i < 200000; ++i) text += fmt::format("{:.6e},{},{}\n", i * 1e-8, i % 4096, i % 5000 == 0 ? std::string("OL") : std::to_string(i % 17));
  ReadOptions options;
  options.threads = 1;
  const Capture one = capture_of(text, options);
  for (const unsigned threads : {2U, 5U}) {
    options.threads = threads;
    const Capture many = capture_of(text, options);
    EXPECT_EQ(many.channels[0].samples, one.channels[0].samples);
    EXPECT_EQ(many.channels[1].missing, one.channels[1].missing);
    EXPECT_EQ(many.time.step_s, one.time.step_s);
    EXPECT_EQ(many.channels[0].resolution, one.channels[0].resolution);
    EXPECT_EQ(one.channels[0].resolution, 1.0);
    EXPECT_EQ(many.findings.size(), one.findings.size());
  }
}

class Listener final : public Progress {
 public:
  explicit Listener(int stop_after) : stop_after_(stop_after) {}
  bool advance(std::string_view, std::uint64_t done, std::uint64_t total) override {
    last_ = done;
    total_ = total;
    return ++calls_ < stop_after_;
  }
  int calls_ = 0;
  std::uint64_t last_ = 0;
  std::uint64_t total_ = 0;

 private:
  int stop_after_;
};

TEST_F(TableReader, TellsItsProgressAndStopsWhenAsked) {
  std::string text = "time (s),CH1 (V)\n";
  for (int i = 0; i < 300000; ++i) text += fmt::format("{:.6e},{}\n", i * 1e-8, i % 4096);
  ReadOptions options;
  Listener patient(1000);
  options.progress = &patient;
  EXPECT_EQ(capture_of(text, options).samples(), 300000U);
  EXPECT_GT(patient.calls_, 2);
  EXPECT_EQ(patient.total_, text.size());
  Listener hasty(1);
  options.progress = &hasty;
  EXPECT_EQ(error_of(text, options).problem, Problem::interrupted);
}

}  // namespace
}  // namespace coilassay

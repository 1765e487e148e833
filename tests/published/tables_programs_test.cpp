// Tables of numbers against Python and NumPy: the same bits. (pandas: tests/benchmarks/read_benchmark.cpp)
#include <gmock/gmock.h>

#include <bit>
#include <cstdio>
#include <cstdlib>
#include <sstream>
#include <string>
#include <vector>

#include "acquire/reader.h"
#include "tests/support/program.h"

namespace coilassay {
namespace {

using Rows = std::vector<std::vector<double>>;

/// What the script prints; empty when it could not run.
Rows python(const std::string& arguments) {
  Rows rows;
  std::FILE* pipe = popen(("/usr/bin/python3 tests/published/tables_numpy.py " + arguments).c_str(), "r");
  std::string text;
  char block[4096];
  for (std::size_t n; (n = std::fread(block, 1, sizeof block, pipe)) > 0;) text.append(block, n);
  if (pclose(pipe) != 0) return {};
  std::istringstream lines(text);
  for (std::string line; std::getline(lines, line);) {
    std::istringstream cells(line);
    rows.emplace_back();
    for (std::string cell; cells >> cell;) rows.back().push_back(std::strtod(cell.c_str(), nullptr));
  }
  return rows;
}

bool same_bits(double a, double b) { return std::bit_cast<std::uint64_t>(a) == std::bit_cast<std::uint64_t>(b); }

// Random doubles of all magnitudes in six forms, written by Python, whose own reading of its text is the truth.
TEST(TablesOfOtherPrograms, NumbersWrittenByPythonAreReadToTheSameBits) {
  const test::TemporaryFolder folder;
  for (const int seed : {1, 2, 3}) {
    const std::string file = folder / "numbers.csv";
    const Rows truth = python("write '" + file + "' " + std::to_string(seed));
    ASSERT_EQ(truth.size(), 2000u) << "python3-numpy is needed for this test";
    const auto read = read_recording(file);
    ASSERT_TRUE(read) << read.error().finding;
    const Capture& capture = std::get<std::vector<Capture>>(*read).front();
    ASSERT_EQ(capture.channels.size(), 3u);
    for (std::size_t row = 0; row < truth.size(); ++row) {
      for (std::size_t c = 0; c < 3; ++c) {
        ASSERT_TRUE(same_bits(capture.channels[c].samples[row], truth[row][c])) << "row " << row << " column " << c;
      }
    }
  }
}

// The readers' own files whose columns are in SI already (another unit is a rounding of its own).
TEST(TablesOfOtherPrograms, PlainDialectsAreReadAsNumPyReadsThem) {
  for (const char* name : {"names-and-numbers.csv", "names-units-rows.csv", "preamble-key-value.csv", "channel-keys.csv",
                           "blanks-in-columns.txt", "peak-detect-pairs.csv"}) {
    const std::string file = std::string("tests/acquire/data/") + name;
    const auto read = read_recording(file);
    ASSERT_TRUE(read) << read.error().finding;
    const Capture& capture = std::get<std::vector<Capture>>(*read).front();
    const Dialect& dialect = capture.dialect;
    const std::string delimiter = dialect.delimiter == "\t" ? "\\t" : dialect.delimiter;
    const Rows theirs =
        python("read " + file + " '" + delimiter + "' '" + dialect.decimal + "' " + std::to_string(dialect.first_data_line));
    ASSERT_GE(theirs.size(), capture.samples()) << name;
    for (const Channel& channel : capture.channels) {
      for (std::size_t row = 0; row < capture.samples(); ++row) {
        ASSERT_TRUE(same_bits(channel.samples[row], theirs[row][channel.column - 1])) << name << ", row " << row;
      }
    }
  }
}

}  // namespace
}  // namespace coilassay

// Good files with one thing damaged: the kind and the place are named.
#include <gtest/gtest.h>

#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using test::MadeFiles;

class ReaderDamage : public MadeFiles {};

std::string good_rows(int count) {
  std::string text = "time (s),CH1 (V)\n";
  for (int i = 0; i < count; ++i) text += std::to_string(i) + "e-6," + std::to_string(0.5 * (i % 5)) + "\n";
  return text;
}

void expect(const Error& error, Problem problem, const std::string& place, const std::string& part) {
  EXPECT_EQ(error.problem, problem) << error.finding;
  EXPECT_EQ(error.place, place) << error.finding;
  EXPECT_NE(error.finding.find(part), std::string::npos) << error.finding;
  EXPECT_FALSE(error.finding.ends_with('.'));
}

TEST_F(ReaderDamage, NoFile) {
  const auto got = read_recording(path("nothing.csv"));
  ASSERT_FALSE(got);
  EXPECT_EQ(got.error().problem, Problem::unreadable);
}

TEST_F(ReaderDamage, ADirectory) {
  const auto got = read_recording(path(""));
  ASSERT_FALSE(got);
  EXPECT_EQ(got.error().problem, Problem::unreadable);
}

TEST_F(ReaderDamage, AnEmptyFile) { expect(error_of(""), Problem::not_a_capture, "capture.csv", "empty"); }

TEST_F(ReaderDamage, BlankLinesOnly) { expect(error_of("\n\n \n"), Problem::not_a_capture, "capture.csv", "blank"); }

TEST_F(ReaderDamage, ABinary) {
  expect(error_of(std::string("\x7f" "ELF\0\0\1\2\3", 9)), Problem::not_a_capture, "capture.csv", "binary");
}

TEST_F(ReaderDamage, ALetterToAFriend) {
  expect(error_of("Dear Kittiwake,\nthe coils arrived.\n"), Problem::not_a_capture, "capture.csv", "no table of numbers");
}

TEST_F(ReaderDamage, OneRowOnly) {
  expect(error_of("t,v\n0,1\n"), Problem::too_few_samples, "capture.csv:2", "one row");
}

TEST_F(ReaderDamage, ARowWithoutItsLastCell) {
  std::string text = good_rows(20);
  text.replace(text.find(",0.500000\n7e-6"), 9, "");
  expect(error_of(text), Problem::damaged, "capture.csv:8", "1 cell where those before have 2");
}

TEST_F(ReaderDamage, ARowOfTextInTheMiddle) {
  std::string text = good_rows(20);
  text.insert(text.find("10e-6"), "trigger lost\n");
  expect(error_of(text), Problem::damaged, "capture.csv:12", "trigger lost");
}

TEST_F(ReaderDamage, AWordInACell) {
  std::string text = good_rows(20);
  text.replace(text.find("10e-6,") + 6, 3, "abc");
  expect(error_of(text), Problem::damaged, "capture.csv:12", "abc");
}

TEST_F(ReaderDamage, ACommaThatIsBothSeparatorAndDecimalSign) {
  const Error error = error_of("t,v\n0,00,1,25\n0,05,1,50\n0,10,1,75\n");
  EXPECT_EQ(error.problem, Problem::ambiguous);
  EXPECT_NE(error.remedy.find("delimiter"), std::string::npos);
  // The option settles it: four columns of whole numbers.
  ReadOptions options;
  options.delimiter = ',';
  const auto four = captures(path("capture.csv"), options);
  ASSERT_TRUE(four);
  EXPECT_GE(four->front().channels.size(), 3U);
}

TEST_F(ReaderDamage, APlaceholderOfALargeFileStore) {
  expect(error_of("version https://store.example/spec/v1\noid sha256:0123456789abcdef\nsize 123456\n"), Problem::not_a_capture,
         "capture.csv", "placeholder");
}

// A table between blanks that ends in one: nothing is cut.
TEST_F(ReaderDamage, ABlankBehindTheLastRowIsNone) {
  std::string text = "t (s)  CH1 (V)\n";
  for (int i = 0; i < 20; ++i) text += std::to_string(i) + "e-6  0." + std::to_string(100 + i) + "\n";
  const auto read = captures(made("capture.txt", text + " "));
  ASSERT_TRUE(read) << read.error().finding;
  EXPECT_EQ(read->front().samples(), 20u);
}

// Taken as the next sample it would be measured at a time nobody knows.
TEST_F(ReaderDamage, ARowWithoutItsTime) {
  expect(error_of("t (s),v (V)\n0,1\n1e-6,2\n,3\n3e-6,4\n4e-6,3\n"), Problem::damaged, "capture.csv:4", "no time");
  expect(error_of("# a\nt (s),v (V)\n0,1\n# b\n1e-6,2\nOL,3\n3e-6,4\n4e-6,3\n"), Problem::damaged, "capture.csv:6", "no time");
  ReadOptions stated;
  stated.sample_interval_s = 1e-6;
  stated.columns = {"-", "v [V]"};
  EXPECT_TRUE(captures(made("capture.csv", "t (s),v (V)\n0,1\n1e-6,2\n,3\n3e-6,4\n4e-6,3\n"), stated));
}

TEST_F(ReaderDamage, ALineWithoutEnd) {
  std::string text = good_rows(50000);
  text.insert(text.size() / 2, std::string(10'000'000, '1'));
  const Error error = error_of(text);
  EXPECT_TRUE(error.problem == Problem::not_a_capture || error.problem == Problem::damaged);
  EXPECT_NE(error.place.find("capture.csv:"), std::string::npos);
}

}  // namespace
}  // namespace coilassay

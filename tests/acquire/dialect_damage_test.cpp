// One good file of every dialect with one thing damaged at a time: refused, with the line.
#include <gmock/gmock.h>

#include <algorithm>
#include <string>
#include <vector>

#include "tests/acquire/made_files.h"

namespace coilassay::test {
namespace {

namespace fs = std::filesystem;

std::vector<std::string> tables() {
  std::vector<std::string> names;
  for (const auto& entry : fs::directory_iterator("tests/acquire/data")) {
    const std::string name = entry.path().filename().string();
    // Cutting lines of UTF-16 by bytes would make another damage of each.
    if (!name.ends_with(".wav") && name.find("utf16") == std::string::npos) names.push_back(name);
  }
  std::sort(names.begin(), names.end());
  return names;
}

class DialectDamage : public MadeFiles, public testing::WithParamInterface<std::string> {
 protected:
  void SetUp() override {
    const std::string good = "tests/acquire/data/" + GetParam();
    const auto read = captures(good);
    ASSERT_TRUE(read) << read.error().finding;
    delimiter_ = read->front().dialect.delimiter.front();
    channels_ = read->front().channels.size();
    std::string text = bytes_of(good);
    for (std::size_t at = 0; at < text.size();) {
      const std::size_t end = std::min(text.find('\n', at), text.size());
      lines_.push_back(text.substr(at, end - at));
      at = end + 1;
    }
    middle_ = lines_.size() * 2 / 3;  // among the numbers of every one of these files
  }
  std::string joined() const {
    std::string text;
    for (const std::string& line : lines_) text += line + '\n';
    return text;
  }
  /// What is said of the damaged file: "37: this row has ..."; "read" when it was.
  std::string said(const std::string& text) const {
    const auto read = captures(made(GetParam(), text));
    if (read) return "read";
    const std::string& place = read.error().place;
    return place.substr(place.rfind(GetParam()) + GetParam().size()) + " " + read.error().finding;
  }
  std::string at_middle() const { return ":" + std::to_string(middle_ + 1) + " "; }
  /// Whether a row is one cell: another line can then not be told by its cells.
  bool one_column() const { return lines_[middle_].find(delimiter_) == std::string::npos; }

  std::vector<std::string> lines_;
  std::size_t middle_ = 0, channels_ = 0;
  char delimiter_ = ',';
};

TEST_P(DialectDamage, ARowOfTextInTheMiddle) {
  lines_.insert(lines_.begin() + static_cast<std::ptrdiff_t>(middle_), "and so on");
  EXPECT_THAT(said(joined()), testing::StartsWith(at_middle()));
}

TEST_P(DialectDamage, ARepeatedHeading) {
  lines_.insert(lines_.begin() + static_cast<std::ptrdiff_t>(middle_), "Time [s]" + std::string(1, delimiter_) + "CH1 [V]");
  const std::string what = said(joined());
  EXPECT_THAT(what, testing::StartsWith(at_middle())) << "a second table behind the first is no more of the same";
}

TEST_P(DialectDamage, ARowThatLostItsLastCell) {
  std::string& row = lines_[middle_];
  const std::string end = row.ends_with('\r') ? "\r" : "";
  const std::size_t cut = row.find_last_of(delimiter_ == ' ' ? std::string(" \t") : std::string(1, delimiter_));
  if (one_column()) {
    row = end;  // nothing is left of it: a sample that is missing, and counted
    const auto read = captures(made(GetParam(), joined()));
    ASSERT_TRUE(read);
    EXPECT_EQ(read->front().channels.front().missing, 1u);
    return;
  }
  row = row.substr(0, cut) + end;
  EXPECT_THAT(said(joined()), testing::StartsWith(at_middle()));
}

TEST_P(DialectDamage, ARowWithACellMore) {
  std::string& row = lines_[middle_];
  if (row.ends_with('\r')) row.pop_back();
  row += std::string(1, delimiter_) + "1";
  EXPECT_THAT(said(joined()), testing::StartsWith(at_middle()));
}

TEST_P(DialectDamage, AZeroByte) {
  lines_[middle_].insert(1, 1, '\0');
  EXPECT_THAT(said(joined()), testing::HasSubstr("binary"));
}

TEST_P(DialectDamage, AWordInPlaceOfANumber) {
  std::string& row = lines_[middle_];
  const std::size_t last = row.find_last_of("0123456789");
  row.replace(last, 1, "x?");
  EXPECT_THAT(said(joined()), testing::StartsWith(at_middle()));
}

TEST_P(DialectDamage, ACutInTheMiddleOfARow) {
  lines_.resize(middle_ + 1);
  std::string text = joined();
  text.resize(text.size() - 1 - lines_.back().size() / 2);
  EXPECT_THAT(said(text), testing::StartsWith(at_middle()));
}

INSTANTIATE_TEST_SUITE_P(Tables, DialectDamage, testing::ValuesIn(tables()), [](const auto& each) {
  std::string name = each.param.substr(0, each.param.rfind('.'));
  std::replace_if(name.begin(), name.end(), [](unsigned char c) { return std::isalnum(c) == 0; }, '_');
  return name;
});

}  // namespace
}  // namespace coilassay::test

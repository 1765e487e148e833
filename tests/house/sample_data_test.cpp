// The samples, measured as sample-data/run.sh measures them, against the truth they were made from.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <sys/wait.h>

#include <cstdio>
#include <fstream>
#include <nlohmann/json.hpp>
#include <string>

#include "tests/house/source_tree.h"
#include "tests/support/paths.h"

namespace coilassay::test {
namespace {

using nlohmann::json;
using testing::Contains;
using testing::HasSubstr;

struct Measuring {
  std::string kind, name, arguments, first_file;
};

std::vector<Measuring> measurings() {
  std::vector<Measuring> all;
  for (const std::string& line : source_file("sample-data/run.sh").lines) {
    if (!line.starts_with("measure ")) continue;
    std::istringstream words(line);
    std::string word;
    Measuring m;
    words >> word >> m.kind >> m.name >> m.first_file;
    std::getline(words, m.arguments);
    m.arguments = m.first_file + m.arguments;
    all.push_back(m);
  }
  return all;
}

json measured(const Measuring& m) {
  // The program's path may be relative to the source folder, the arguments are to sample-data.
  const std::string command =
      "program=$(realpath '" + program() + "') && cd sample-data && \"$program\" " + m.kind + " " + m.arguments + " --json --quiet";
  std::FILE* pipe = popen(command.c_str(), "r");
  if (pipe == nullptr) return {};
  std::string text;
  char block[4096];
  for (std::size_t n; (n = std::fread(block, 1, sizeof block, pipe)) > 0;) text.append(block, n);
  EXPECT_EQ(pclose(pipe), 0) << command;
  return json::parse(text, nullptr, false);
}

// Fixed files: that each interval holds the truth is no game of chance here, it did when they were made.
TEST(SampleData, EveryIntervalHoldsTheTruth) {
  const auto all = measurings();
  ASSERT_GE(all.size(), 9u);
  for (const Measuring& m : all) {
    const json result = measured(m);
    ASSERT_TRUE(result.is_object()) << m.name;
    const std::string stem = m.first_file.substr(0, m.first_file.rfind('.'));
    const json truth = json::parse(std::ifstream("sample-data/" + stem + ".truth.json")).at("truth");
    std::size_t compared = 0;
    for (const auto& [symbol, quantity] : result.at("quantities").items()) {
      if (!truth.contains(symbol) || !quantity.contains("interval")) continue;
      const double value = truth.at(symbol);
      EXPECT_LE(quantity["interval"][0].get<double>(), value) << m.name << ' ' << symbol;
      EXPECT_GE(quantity["interval"][1].get<double>(), value) << m.name << ' ' << symbol;
      ++compared;
    }
    EXPECT_GE(compared, m.kind == "resistance" ? 2u : 3u) << m.name;
  }
}

TEST(SampleData, WhatWentWrongWithACaptureIsFound) {
  const std::map<std::string, std::string> expected{{"drum-coarse", "coarse_range"},
                                                    {"drum-clipped", "clipped"},
                                                    {"charging-driven", "drive_in_window"},
                                                    {"suppression-choke", "near_critical"}};
  std::size_t seen = 0;
  for (const Measuring& m : measurings()) {
    const auto planted = expected.find(m.name);
    if (planted == expected.end()) continue;
    ++seen;
    std::vector<std::string> codes;
    const json result = measured(m);
    for (const json& finding : result.at("findings")) codes.push_back(finding.at("code"));
    EXPECT_THAT(codes, Contains(planted->second)) << m.name;
  }
  EXPECT_EQ(seen, expected.size());
}

TEST(SampleData, TheLotIsRejectedForTheUnitsThatWerePlantedInIt) {
  const std::string command = "program=$(realpath '" + program() +
                              "') && cd sample-data && \"$program\" inspect drum.toml drum-lot --lot-size 500 --json --quiet";
  std::FILE* pipe = popen(command.c_str(), "r");
  ASSERT_NE(pipe, nullptr);
  std::string text;
  char block[4096];
  for (std::size_t n; (n = std::fread(block, 1, sizeof block, pipe)) > 0;) text.append(block, n);
  EXPECT_EQ(WEXITSTATUS(pclose(pipe)), 1);
  const json lot = json::parse(text, nullptr, false);
  ASSERT_TRUE(lot.is_object());
  EXPECT_EQ(lot.at("decision"), "reject");
  EXPECT_EQ(lot.at("units").size(), 50u);
  std::map<std::string, std::string> verdicts;
  for (const json& unit : lot.at("units")) {
    if (unit.at("verdict") != "pass") verdicts[unit.at("serial")] = unit.at("verdict");
  }
  const std::map<std::string, std::string> planted{
      {"0407", "fail"}, {"0423", "fail"}, {"0431", "undecided"}, {"0438", "not_comparable"}};
  EXPECT_EQ(verdicts, planted);
  EXPECT_EQ(lot.at("check_standard").at("state"), "good");
}

TEST(SampleData, EveryCaptureSaysThatItIsSimulatedAndHowItWasMade) {
  const std::string recipe = source_file("sample-data/make.sh").text();
  const auto captures = source_files({"sample-data"}, {".csv"});
  ASSERT_GE(captures.size(), 10u);
  for (const SourceFile& capture : captures) {
    std::string head;
    for (std::size_t i = 0; i < 10 && i < capture.lines.size(); ++i) head += capture.lines[i] + '\n';
    EXPECT_THAT(head, HasSubstr("origin,simulated")) << capture.path;
    const std::string stem = capture.path.substr(12, capture.path.size() - 12 - 4);
    EXPECT_THAT(recipe, HasSubstr(stem)) << "make.sh does not make it";
  }
}

}  // namespace
}  // namespace coilassay::test

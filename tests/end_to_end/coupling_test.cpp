// Coupled windings from values and files to result, through the program itself.
#include <gmock/gmock.h>

#include <cmath>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::Contains;
using testing::HasSubstr;
using nlohmann::json;

json simulate_coupled(const std::string& output, const std::vector<std::string>& parameters) {
  std::vector<std::string> arguments = {"simulate", "coupled", "-o", output, "--truth", output + ".json"};
  arguments.insert(arguments.end(), parameters.begin(), parameters.end());
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, 0) << end.error;
  const std::string truth = contents_of(output + ".json");
  EXPECT_EQ(schema_trouble(truth, "truth"), "");
  return json::parse(truth);
}

const std::vector<std::string> kPair = {"--inductance", "24uH",   "--inductance", "60uH",    "--resistance", "0.1ohm",
                                        "--resistance", "0.3ohm", "--coupling",   "0.31",    "--noise",      "0.1%"};

std::vector<std::string> codes(const json& result) {
  std::vector<std::string> all;
  for (const json& finding : result.at("findings")) all.push_back(finding.at("code"));
  return all;
}

TEST(Coupling, StatedValuesGiveTheTextbookResult) {
  const json result = measured_json({"coupling", "--primary-open", "100uH±1%", "--primary-short", "19uH±1%", "--secondary-open", "400uH±1%", "--dots", "same"});
  EXPECT_NEAR(result.at("quantities").at("k").at("value").get<double>(), 0.9, 1e-6);
  EXPECT_NEAR(result.at("quantities").at("M").at("value").get<double>(), 180e-6, 1e-9);
  EXPECT_EQ(result.at("inputs").size(), 3u);
  EXPECT_NEAR(result.at("equivalents").at("T").at("L_a").at("value").get<double>(), -80e-6, 1e-9);
  EXPECT_EQ(result.at("sources").size(), 0u);
}

TEST(Coupling, APortFileGivesIntervalsThatHoldTheTruth) {
  const TemporaryFolder folder;
  const std::string file = folder / "pair.s2p";
  std::vector<std::string> parameters = kPair;
  parameters.insert(parameters.end(), {"--reversed-dots", "--seed", "5"});
  const json truth = simulate_coupled(file, parameters).at("truth");
  EXPECT_LT(truth.at("k").get<double>(), 0);
  const json result = measured_json({"coupling", file, "--exact-bench", "--netlist", folder / "pair.cir"});
  for (const char* symbol : {"L_1", "L_2", "M", "k", "n", "L_leak_1", "L_leak_2"}) EXPECT_TRUE(covers(result, symbol, truth.at(symbol).get<double>()));
  EXPECT_THAT(contents_of(folder / "pair.cir"), HasSubstr(".subckt pair a1 b1 a2 b2"));
}

TEST(Coupling, SweepsAreSolvedTogetherAndDrawn) {
  const TemporaryFolder folder;
  const std::string stem = folder / "coils";
  const json truth = simulate_coupled(stem, kPair).at("truth");
  const std::vector<std::string> arguments = {"coupling", "--primary-open", stem + "-primary-open.csv", "--primary-short", stem + "-primary-short.csv",
                                              "--secondary-open", stem + "-secondary-open.csv", "--aiding", stem + "-aiding.csv",
                                              "--opposing", stem + "-opposing.csv", "--at", "100kHz", "--at", "500kHz"};
  const json result = measured_json(arguments);
  for (const char* symbol : {"L_1", "M", "k"}) EXPECT_TRUE(covers(result, symbol, truth.at(symbol).get<double>()));
  ASSERT_EQ(result.at("points").size(), 2u);
  EXPECT_EQ(result.at("points")[1].at("at_Hz"), 500e3);
  std::vector<std::string> drawn = arguments;
  drawn.insert(drawn.end(), {"--figure", folder / "coils.svg", "--report", folder / "coils.html"});
  const ProgramEnd end = run_program_process(drawn);
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("coupling factor"));
  EXPECT_THAT(contents_of(folder / "coils.svg"), HasSubstr("<svg"));
  EXPECT_THAT(contents_of(folder / "coils.html"), HasSubstr("What each input says"));
}

TEST(Coupling, SineCapturesAreInputs) {
  const TemporaryFolder folder;
  const auto capture = [&](const std::string& name, const std::string& inductance) {
    const ProgramEnd end = run_program_process({"simulate", "sine", "-o", folder / name, "--inductance", inductance, "--resistance", "0.5ohm", "--frequency", "100kHz",
                                                "--noise", "1mV", "--current-noise", "5uA", "--bits", "12"});
    EXPECT_EQ(end.exit_code, 0) << end.error;
    return folder / name;
  };
  const json result = measured_json({"coupling", "--primary-open", capture("open.csv", "100uH"), "--primary-short", capture("short.csv", "36uH"),
                                     "--secondary-open", capture("second.csv", "101uH"), "--current", "CH2"});
  // The windings' resistance goes along with each capture; 36 uH = (1 - k^2) 100 uH to what 0.5 ohm changes at wL = 63 ohm.
  EXPECT_NEAR(result.at("quantities").at("k").at("value").get<double>(), 0.8, 0.002);
  // Gains are those of one bench: they make L uncertain, and k hardly.
  const auto relative = [&](const char* symbol) {
    const json& q = result.at("quantities").at(symbol);
    return q.at("U").get<double>() / q.at("value").get<double>();
  };
  EXPECT_GT(relative("L_1"), 10 * relative("k"));
}

TEST(Coupling, WithoutKTheExitIsThree) {
  for (const auto& [arguments, code] : std::vector<std::pair<std::vector<std::string>, std::string>>{
           {{"--primary-open", "100uH±1%"}, "too_few_inputs"},
           {{"--primary-open", "100uH±1%", "--primary-short", "120uH±1%"}, "short_above_open"},
           {{"--primary-open", "100uH±1%", "--primary-short", "99uH±1%"}, "k_cancellation"},
           {{"--primary-open", "100uH±1%", "--secondary-open", "400uH±1%", "--aiding", "940uH±1%", "--opposing", "60uH±1%"}, "k_above_one"},
           {{"--ratio-forward", "1.8±1%"}, "too_few_inputs"}}) {
    std::vector<std::string> line = {"coupling"};
    line.insert(line.end(), arguments.begin(), arguments.end());
    EXPECT_THAT(codes(measured_json(line, 3)), Contains(code));
  }
  const json bound = measured_json({"coupling", "--primary-open", "100uH±1%", "--primary-short", "99uH±1%"}, 3);
  EXPECT_GT(bound.at("bounds").at("k").at("at_most").get<double>(), 0.1);
}

TEST(Coupling, BothSidesOfAMatrixMustAgree) {
  const TemporaryFolder folder;
  for (const char* fine : {"100uH,50uH\n50uH,100uH\n", "100uH,50uH\n,100uH\n", "100uH,50uH\n50.3uH,100uH\n"}) {
    const json result = measured_json({"coupling", "--matrix", folder.file("fine.txt", fine)});
    EXPECT_NEAR(result.at("quantities").at("k").at("value").get<double>(), 0.5, 1e-9) << fine;
    EXPECT_NEAR(result.at("quantities").at("k").at("U").get<double>(), 0.0067, 0.0001) << "a cell written twice is known no better";
  }
  const json pair = measured_json({"coupling", "--matrix", folder.file("pair.txt", "100uH,50uH\n5uH,100uH\n")}, 3);
  EXPECT_THAT(codes(pair), Contains("not_reciprocal"));
  EXPECT_FALSE(pair.at("quantities").contains("k"));
  const json three = measured_json({"coupling", "--matrix", folder.file("three.txt", "100uH,50uH,20uH\n50uH,100uH,20uH\n20uH,2uH,100uH\n")});
  EXPECT_THAT(codes(three), Contains("not_reciprocal"));
  EXPECT_TRUE(three.at("quantities").contains("k")) << "another pair than the one asked for";
  EXPECT_FALSE(three.contains("matrices"));
}

TEST(Coupling, WhatCannotBeUsedEndsWithTwoAndARemedy) {
  const TemporaryFolder folder;
  const std::string file = folder / "pair.s2p";
  simulate_coupled(file, kPair);
  const std::string table = folder.file("sweep.csv", "frequency [Hz],Re(Z) [ohm],Im(Z) [ohm]\n1000,0.1,1\n2000,0.1,2\n3000,0.1,3\n");
  for (const std::vector<std::string>& arguments :
       std::vector<std::vector<std::string>>{{"coupling"},
                                             {"coupling", "--primary-open", file},
                                             {"coupling", table},
                                             {"coupling", file, "--pair", "1,3"},
                                             {"coupling", file, "--at", "10MHz"},
                                             {"coupling", "--primary-open", "100nF"},
                                             {"coupling", "--primary-open", "1e308H"},
                                             {"coupling", "--primary-open", table, "--secondary-open", table},
                                             {"coupling", "--primary-open", "100uH@0Hz"},
                                             {"coupling", "--primary-open", "no-such-file.csv"},
                                             {"coupling", "--primary-open", "100uH", "--winding-resistance", "0.1ohm"},
                                             {"coupling", "--primary-open", "100uH", "--winding-resistance", "0.1ohm,0.2ohm"},
                                             {"coupling", "--primary-open", "100uH", "--at", "1kHz", "--at", "2kHz"},
                                             {"coupling", "--rough", "1uH,1uH,0.5"},
                                             {"coupling", "--advise"},
                                             {"simulate", "coupled", "-o", folder / "x.s3p"},
                                             {"simulate", "coupled", "-o", folder / "x", "--coupling", "1.5"}}) {
    const ProgramEnd end = run_program_process(arguments);
    EXPECT_EQ(end.exit_code, 2) << arguments.back();
    EXPECT_THAT(end.error, HasSubstr("try: ")) << arguments.back();
  }
}

TEST(Coupling, AdviceFollowsItsSchema) {
  const ProgramEnd end = run_program_process({"coupling", "--advise", "--rough", "100uH,400uH,0.1", "--accuracy", "1%", "--wanted", "10%", "--json"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_EQ(schema_trouble(end.out, "advice"), "");
  const json advice = json::parse(end.out);
  EXPECT_EQ(advice.at("best"), "ratios");
  // After measuring: what was found so far stands in for rough values.
  const ProgramEnd after = run_program_process({"coupling", "--advise", "--primary-open", "100uH±1%", "--primary-short", "99uH±1%", "--secondary-open", "400uH±1%"});
  EXPECT_EQ(after.exit_code, 0) << after.error;
  EXPECT_THAT(after.out, HasSubstr("The narrowest by itself"));
}

TEST(Coupling, SeveralWindingsGiveMatrices) {
  const TemporaryFolder folder;
  const std::string file = folder / "three.s3p";
  const json truth = simulate_coupled(file, {"--inductance", "24uH", "--inductance", "60uH", "--inductance", "10uH", "--coupling", "0.31", "--coupling", "0.5",
                                             "--coupling", "0.2", "--noise", "0.1%"});
  const json result = measured_json({"coupling", file});
  EXPECT_EQ(result.at("matrices").at("positive_definite"), true);
  EXPECT_NEAR(result.at("matrices").at("coupling")[0][2].get<double>(), 0.5, 0.001);
  const std::string typed = folder.file("typed.txt", "100uH,-50uH±1%,80uH\n,100uH,80uH\n,,100uH\n");
  const json impossible = measured_json({"coupling", "--matrix", typed, "--pair", "1,3"});
  EXPECT_EQ(impossible.at("matrices").at("positive_definite"), false);
  EXPECT_THAT(codes(impossible), Contains("not_positive_definite"));
  EXPECT_NEAR(impossible.at("quantities").at("k").at("value").get<double>(), 0.8, 1e-6);
}

TEST(Coupling, EachInputOfAPortFileSaysHowFarItIsOff) {
  const nlohmann::json result = measured_json({"coupling", "sample-data/charging-pair.s2p"});
  std::size_t off = 0;
  for (const auto& input : result.at("inputs")) {
    const double u = input.at("u").get<double>();
    const double away = (input.at("value").get<double>() - input.at("predicted").get<double>()) / u;
    EXPECT_NEAR(input.at("residual_u").get<double>(), away, 1e-6 + 1e-6 * std::fabs(away)) << input;
    off += std::fabs(away) > 0.01 ? 1 : 0;
  }
  EXPECT_GE(off, 2u) << "otherwise nothing was seen";
}

}  // namespace
}  // namespace coilassay::test

#include "report/result_json.h"

#include <gtest/gtest.h>

#include <limits>
#include <nlohmann/json.hpp>

#include "base/number_text.h"
#include "report/json_writer.h"
#include "tests/report/made_up.h"
#include "tests/report/schema_check.h"

namespace coilassay {
namespace {

using Json = nlohmann::ordered_json;
constexpr std::string_view kProgram = "coilassay 0.1.0";

Json document(const Measurement& m) {
  return Json::parse(to_json(m, kProgram));
}

std::vector<std::string> keys(const Json& object) {
  std::vector<std::string> list;
  for (const auto& [key, value] : object.items()) list.push_back(key);
  return list;
}
using Keys = std::vector<std::string>;

// Names and order as promised to programs that read results.
TEST(ResultJson, KeysStandInTheirPromisedOrder) {
  const Json d = document(test::made_up_ring_down());
  EXPECT_EQ(keys(d), (Keys{"schema", "program", "test", "sources", "conditions", "equipment", "corrections",
                           "quantities", "bounds", "correlations", "budget", "findings", "cautions", "model"}));
  EXPECT_EQ(d["schema"], "coilassay.result/1");
  EXPECT_EQ(d["program"], "coilassay 0.1.0");
  EXPECT_EQ(keys(d["sources"][0]), (Keys{"file", "sha256", "samples", "sample_interval_s"}));
  EXPECT_EQ(keys(d["conditions"]),
            (Keys{"frequency_Hz", "level_V", "level_A", "bias_A", "peak_current_A", "temperature_degC"}));
  EXPECT_TRUE(d["conditions"]["level_V"].is_null());
  EXPECT_EQ(keys(d["quantities"]["L_s"]),
            (Keys{"value", "unit", "u", "k", "U", "interval", "confidence", "dof", "at_Hz"}));
  EXPECT_TRUE(d["quantities"]["L_s"]["dof"].is_null());
  EXPECT_EQ(keys(d["bounds"]["f_r"]), (Keys{"at_least", "unit", "confidence"}));
  EXPECT_EQ(d["correlations"][0], Json::parse(R"(["L_s", "R_s", 0.31])"));
  EXPECT_EQ(keys(d["findings"][0]), (Keys{"code", "severity", "message", "figure", "about"}));
  EXPECT_EQ(keys(d["cautions"][0]), (Keys{"code", "severity", "message", "figure", "unit", "basis"}));
  EXPECT_EQ(keys(d["model"]), (Keys{"name", "parameters", "runner_up", "left_out", "window_s", "residual_rms",
                                    "reduced_chi_square", "converged"}));
}

TEST(ResultJson, KeepsToItsSchema) {
  for (const Measurement& m :
       {test::made_up_ring_down(), test::made_up_line(), test::made_up_refusal(), test::made_up_ramp(),
        test::made_up_sine(), test::with_hostile_names(test::made_up_ring_down())}) {
    EXPECT_EQ(test::schema_trouble(to_json(m, kProgram), "result"), "") << m.test;
  }
}

// The schema must be able to say no, or the test above would mean nothing.
TEST(ResultJson, SchemaRefusesADamagedDocument) {
  const Json good = document(test::made_up_ring_down());
  const auto trouble = [&good](const char* pointer, const Json& value) {
    Json damaged = good;
    damaged[Json::json_pointer(pointer)] = value;
    return test::schema_trouble(damaged.dump(), "result");
  };
  EXPECT_NE(trouble("/schema", "coilassay.result/2"), "");
  EXPECT_NE(trouble("/quantities/L_s/value", nullptr), "");
  EXPECT_NE(trouble("/quantities/L_s/unit", "uH"), "");
  EXPECT_NE(trouble("/findings/0/severity", "bad"), "");
  EXPECT_NE(trouble("/sources/0/sha256", "abc"), "");
  Json without = good;
  without.erase("findings");
  EXPECT_NE(test::schema_trouble(without.dump(), "result"), "");
  Json more = good;
  more["new_key"] = 1;
  EXPECT_EQ(test::schema_trouble(more.dump(), "result"), "");
}

TEST(ResultJson, HalfWidthIsTheLargerHalfAndKIsItsRatio) {
  const Json q = document(test::made_up_ramp())["quantities"];
  EXPECT_DOUBLE_EQ(q["I_sat_30"]["U"], 2.49 - 2.31);
  EXPECT_EQ(q["I_sat_30"]["interval"], Json::parse("[2.27, 2.49]"));
  EXPECT_EQ(q["I_sat_30"]["definition"], "ramp_incremental");
  EXPECT_EQ(q["L_0"]["reference_A"], 0.05);
  EXPECT_EQ(q["L_0"]["dof"], 7.0);
}

TEST(ResultJson, WhatIsNotKnownIsNullOrAbsentNeverANumber) {
  Measurement m = test::made_up_ring_down();
  m.estimates[0].quantity.value = std::nan("");
  m.estimates[1].high = std::numeric_limits<double>::infinity();
  m.estimates[2].quantity.standard_uncertainty = std::nan("");
  m.sources[0].sample_interval_s = std::nan("");
  m.model->reduced_chi_square = std::nan("");
  const std::string text = to_json(m, kProgram);
  const Json d = Json::parse(text);
  EXPECT_FALSE(d["quantities"].contains("f_0"));
  EXPECT_TRUE(d["quantities"]["alpha"]["interval"][1].is_null());
  EXPECT_TRUE(d["quantities"]["alpha"]["U"].is_null());
  EXPECT_TRUE(d["quantities"]["Q"]["u"].is_null());
  EXPECT_TRUE(d["sources"][0]["sample_interval_s"].is_null());
  EXPECT_EQ(test::schema_trouble(text, "result"), "");
}

TEST(ResultJson, RefusedMeasurementHasNoLeadingQuantityAndSaysWhy) {
  const Json d = document(test::made_up_refusal());
  EXPECT_TRUE(d["quantities"].is_object());
  EXPECT_TRUE(d["quantities"].empty());
  EXPECT_FALSE(d.contains("model"));
  EXPECT_EQ(d["findings"][1]["severity"], "refusal");
}

TEST(ResultJson, CurvesAreColumnsPointsAreRowsAndTracesStayOut) {
  const Json ramp = document(test::made_up_ramp());
  EXPECT_EQ(ramp["curve"]["current_A"], Json::parse("[0.0, 1.0, 2.0]"));
  EXPECT_TRUE(ramp["curve"]["incremental_U_H"][2].is_null());
  const Json sine = document(test::made_up_sine());
  EXPECT_EQ(keys(sine["points"][0]), (Keys{"at_Hz", "level_A", "L_s", "from"}));
  const Json line = document(test::made_up_line());
  EXPECT_EQ(keys(line["points"][1]), (Keys{"capacitance_F", "f_0", "from"}));
  EXPECT_FALSE(line.contains("line"));  // whether a figure was asked for must not change the document
  EXPECT_EQ(to_json(test::made_up_line(), kProgram).find("trace"), std::string::npos);
}

TEST(ResultJson, ATableOfPointsBecomesRows) {
  Measurement m = test::made_up_ramp();
  m.tables = {{"points", {{"at_Hz", Unit::hertz, {1e3, 1e4}}, {"R_s", Unit::ohm, {0.3, std::nan("")}}}}};
  EXPECT_EQ(document(m)["points"], Json::parse(R"([{"at_Hz": 1000.0, "R_s": 0.3}, {"at_Hz": 10000.0}])"));
}

// Digits by the shortest text that reads back; cases where a printf of 15 or 17 digits would differ.
TEST(JsonText, NumbersAreTheShortestThatReadBack) {
  const Json list = {0.1, 1.0 / 3, 2e-8, 232000.0, 1e22, 5e-324, 1.7976931348623157e308, 4.7e-5, 9007199254740993.0};
  const std::string text = json_text(list);
  EXPECT_EQ(text,
            "[0.1, 0.3333333333333333, 2e-08, 232000.0, 1e+22, 5e-324, 1.7976931348623157e+308, 4.7e-05, "
            "9007199254740992.0]\n");
  EXPECT_EQ(Json::parse(text), list);
}

TEST(JsonText, TwoBlanksOneLineFeedAndPlainListsOnOneLine) {
  EXPECT_EQ(json_text({{"a", {1, 2}}, {"b", {{"c", nullptr}}}, {"d", Json::array()}, {"e", Json::object()}}),
            "{\n  \"a\": [1, 2],\n  \"b\": {\n    \"c\": null\n  },\n  \"d\": [],\n  \"e\": {}\n}\n");
  EXPECT_EQ(json_text({{"a", std::numeric_limits<double>::infinity()}}), "{\n  \"a\": null\n}\n");
}

TEST(ResultJson, HostileNamesBecomeVisibleEscapes) {
  const std::string text = to_json(test::with_hostile_names(test::made_up_ring_down()), kProgram);
  for (const char* forbidden : {"\x1b", "\xe2\x80\xae", "\xff", "\n!touch"})
    EXPECT_EQ(text.find(forbidden), std::string::npos);
  const Json d = Json::parse(text);
  EXPECT_NE(d["sources"][0]["file"].get<std::string>().find("\\x1b[31m\\u202e\\xff"), std::string::npos);
}

TEST(ErrorJson, CarriesProblemPlaceFindingAndRemedy) {
  const Error error{Problem::missing_column, "ring.csv:3\x1b", "no column 'x'", "name it"};
  const std::string text = to_json(error);
  EXPECT_EQ(test::schema_trouble(text, "error"), "");
  EXPECT_EQ(keys(Json::parse(text)), (Keys{"schema", "problem", "place", "finding", "remedy"}));
  EXPECT_EQ(Json::parse(text)["problem"], "missing_column");
  EXPECT_EQ(Json::parse(text)["place"], "ring.csv:3\\x1b");
}

TEST(ErrorJson, EveryProblemIsInTheSchema) {
  for (int i = 0; i <= static_cast<int>(Problem::interrupted); ++i) {
    EXPECT_EQ(test::schema_trouble(to_json(Error{static_cast<Problem>(i), "p", "f", ""}), "error"), "");
  }
}

// The example of the interface description, and a sweep.
TEST(DescribeSchema, TakesWaveformsSweepsAndLists) {
  const std::string wave = R"({"schema": "coilassay.describe/1", "kind": "waveform", "samples": 48, "start_s": -1.6e-6,
    "sample_interval_s": 2e-7, "uniform": true, "dialect": {"encoding": "utf-8", "delimiter": ",", "decimal": "."},
    "channels": [{"name": "CH1", "unit": "V", "first": 0.0, "last": -2.0, "min": -4.04, "max": 4.8, "missing": 0,
    "noise": 0.01, "effective_bits": 7.1, "range_used": 0.62, "clipped": 0, "resolution": 0.04}],
    "segments": [{"label": "", "samples": 48, "start_s": 0.0}], "findings": [],
    "suggestion": {"test": "ringdown", "command": "coilassay ringdown ring.csv"}})";
  const std::string sweep =
      R"({"schema": "coilassay.describe/1", "kind": "sweep", "samples": 201, "frequency_first_Hz": 100.0,
    "frequency_last_Hz": 1e6, "parameter": "S", "ports": 1, "reference_ohm": [50.0], "dialect": {}, "findings": [], "suggestion": null})";
  EXPECT_EQ(test::schema_trouble(wave, "describe"), "");
  EXPECT_EQ(test::schema_trouble(sweep, "describe"), "");
  EXPECT_EQ(test::schema_trouble(R"({"schema": "coilassay.describe-list/1", "files": [)" + wave + "," + sweep + "]}",
                                 "describe"),
            "");
  Json broken = Json::parse(wave);
  broken.erase("channels");
  EXPECT_NE(test::schema_trouble(broken.dump(), "describe"), "");
}

TEST(TruthSchema, TakesASimulationAndRefusesOneWithoutSeed) {
  Json truth = {{"schema", "coilassay.truth/1"},
                {"kind", "ringdown"},
                {"seed", 7},
                {"parameters", {{"inductance", 47e-6}}},
                {"truth", {{"L_s", 47e-6}, {"f_d", nullptr}}}};
  EXPECT_EQ(test::schema_trouble(truth.dump(), "truth"), "");
  truth.erase("seed");
  EXPECT_NE(test::schema_trouble(truth.dump(), "truth"), "");
}

}  // namespace
}  // namespace coilassay

#include "report/describe_json.h"

#include <gtest/gtest.h>

#include <cmath>
#include <nlohmann/json.hpp>

#include "tests/report/schema_check.h"

namespace coilassay::test {
namespace {

using Json = nlohmann::json;

Description made_up_waveform() {
  Description d;
  d.kind = "waveform";
  d.source = {.name = "ring.csv", .sha256 = std::string(64, 'a'), .bytes = 1234, .identity = ""};
  d.dialect = {.format = "table",
               .encoding = "utf-8",
               .delimiter = ";",
               .decimal = ",",
               .first_data_line = 4,
               .settings = {{"Model", "bench scope"}}};
  d.samples = 48;
  d.start_s = -1.6e-6;
  d.sample_interval_s = 2e-7;
  d.span_s = 9.4e-6;
  ChannelDescription c;
  c.name = "CH1";
  c.unit = Unit::volt;
  c.unit_stated = true;
  c.column = 2;
  c.first = 0, c.last = -2, c.min = -4.04, c.max = 4.8;
  c.noise = 0.0115, c.noise_is_rounding = true, c.effective_bits = 7.8, c.range_used = 0.62, c.resolution = 0.04;
  d.channels = {c};
  d.segments = {{"", 48, -1.6e-6}};
  d.findings = {{"coarse_range", Severity::note, "CH1 spans few codes", "CH1", 0.1, Unit::one}};
  d.suggestion = {"ringdown", "coilassay ringdown ring.csv", "a free decay", "Add --capacitor."};
  return d;
}

Description made_up_sweep() {
  Description d;
  d.kind = "sweep";
  d.source.name = "z.s2p";
  d.dialect.format = "touchstone";
  d.samples = 201;
  d.frequency_first_hz = 1e4, d.frequency_last_hz = 1e7;
  d.parameter = "S";
  d.ports = 2;
  d.reference_ohm = {50, 75};
  return d;
}

TEST(DescribeJson, KeepsToItsSchema) {
  for (const Description& d : {made_up_waveform(), made_up_sweep()})
    EXPECT_EQ(schema_trouble(to_json(d), "describe"), "");
}

TEST(DescribeJson, SaysWhatWasRead) {
  const Json document = Json::parse(to_json(made_up_waveform()));
  EXPECT_EQ(document["schema"], "coilassay.describe/1");
  EXPECT_EQ(document["kind"], "waveform");
  EXPECT_EQ(document["samples"], 48);
  EXPECT_EQ(document["start_s"], -1.6e-6);
  EXPECT_EQ(document["sample_interval_s"], 2e-7);
  EXPECT_EQ(document["uniform"], true);
  EXPECT_EQ(document["dialect"]["delimiter"], ";");
  EXPECT_EQ(document["dialect"]["decimal"], ",");
  EXPECT_EQ(document["channels"][0]["unit"], "V");
  EXPECT_EQ(document["channels"][0]["range_used"], 0.62);
  EXPECT_EQ(document["suggestion"]["command"], "coilassay ringdown ring.csv");
  const Json sweep = Json::parse(to_json(made_up_sweep()));
  EXPECT_EQ(sweep["frequency_last_Hz"], 1e7);
  EXPECT_EQ(sweep["reference_ohm"], Json({50, 75}));
  EXPECT_FALSE(sweep.contains("channels"));
}

TEST(DescribeJson, WhatIsNotKnownIsNullAndNeverLeftOut) {
  Description d = made_up_waveform();
  d.channels = {ChannelDescription{}};
  d.start_s = d.sample_interval_s = std::nan("");
  d.uniform = false;
  d.suggestion = {};
  const std::string text = to_json(d);
  EXPECT_EQ(schema_trouble(text, "describe"), "");
  const Json document = Json::parse(text);
  for (const char* key :
       {"first", "last", "min", "max", "noise", "effective_bits", "range_used", "resolution", "unit"}) {
    ASSERT_TRUE(document["channels"][0].contains(key)) << key;
    EXPECT_TRUE(document["channels"][0][key].is_null()) << key;
  }
  EXPECT_EQ(document["channels"][0]["missing"], 0);
  EXPECT_EQ(document["channels"][0]["clipped"], 0);
  EXPECT_TRUE(document["start_s"].is_null());
  EXPECT_TRUE(document["sample_interval_s"].is_null());
  EXPECT_TRUE(document["suggestion"]["test"].is_null());
}

TEST(DescribeJson, AListHoldsUnreadableFilesAsTheirErrors) {
  const std::vector<DescribedFile> files = {
      {"ring.csv", made_up_waveform()},
      {"gone.csv", failure(Problem::unreadable, "gone.csv", "there is no such file", "check the name")}};
  const std::string text = to_json(files);
  EXPECT_EQ(schema_trouble(text, "describe"), "");
  const Json document = Json::parse(text);
  EXPECT_EQ(document["schema"], "coilassay.describe-list/1");
  ASSERT_EQ(document["files"].size(), 2u);
  EXPECT_EQ(document["files"][0]["schema"], "coilassay.describe/1");
  EXPECT_EQ(document["files"][1]["schema"], "coilassay.error/1");
  EXPECT_EQ(document["files"][1]["problem"], "unreadable");
  EXPECT_EQ(schema_trouble(document["files"][1].dump(), "error"), "");
}

TEST(DescribeJson, OutsideTextIsMadeVisible) {
  Description d = made_up_waveform();
  d.source.name = d.channels[0].name = d.segments[0].label = "a\x1b[2J\xff\xe2\x80\xae";
  d.dialect.settings = {{"\x07", "\xc0"}};
  const std::string text = to_json(d);
  EXPECT_EQ(schema_trouble(text, "describe"), "");
  EXPECT_EQ(text.find('\x1b'), std::string::npos);
  EXPECT_EQ(text.find("\xe2\x80\xae"), std::string::npos);
}

}  // namespace
}  // namespace coilassay::test

#include "report/describe_text.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <sstream>

#include "report/text_layout.h"

namespace coilassay::test {
namespace {

bool contains(const std::string& text, const std::string& part) {
  return text.find(part) != std::string::npos;
}

Description made_up_page() {
  Description d;
  d.kind = "waveform";
  d.source.name = "my ring.csv";
  d.dialect = {.format = "table",
               .encoding = "utf-8",
               .delimiter = ";",
               .decimal = ",",
               .first_data_line = 4,
               .settings = {{"Model", "bench scope"}}};
  d.samples = 20000;
  d.start_s = -2e-5;
  d.sample_interval_s = 2e-8;
  d.span_s = 19999 * 2e-8;
  ChannelDescription c;
  c.name = "CH1";
  c.unit = Unit::volt;
  c.unit_stated = true;
  c.column = 2;
  c.first = 0, c.last = -0.02, c.min = -4.04, c.max = 4.8;
  c.noise = 0.0115, c.noise_is_rounding = true, c.effective_bits = 7.83, c.range_used = 0.62, c.resolution = 0.04;
  d.channels = {c, c};
  d.channels[1].name = "Ω µ";
  d.channels[1].clipped = 12;
  d.segments = {{"", 20000, -2e-5}};
  d.findings = {{"uneven_step", Severity::note, "a note first", "", 0, Unit::one},
                {"clipped", Severity::caution, "12 samples stand at a flat top", "CH2", 12, Unit::one}};
  d.suggestion = {"ringdown", "coilassay ringdown 'my ring.csv' --voltage CH1", "a free decay", "Add --capacitor."};
  return d;
}

TEST(DescribeText, SaysHowTheFileWasReadAndWhatIsInIt) {
  const std::string page = to_text(made_up_page(), {});
  for (const char* part :
       {"my ring.csv: waveform, 2 channels", "table, utf-8", "between semicolons, decimal comma", "from line 4",
        "20000 every 20 ns, over 400.0 µs", "from -20 µs in even steps of 20 ns", "4.800 V", "62 %", "7.8",
        "(rounding)", "12 samples stand at a flat top", "It looks like a free decay."}) {
    EXPECT_TRUE(contains(page, part)) << part << "\n" << page;
  }
  EXPECT_LT(page.find("caution"), page.find("a note first"));
}

TEST(DescribeText, TheCommandStandsAloneOnItsLineUnbroken) {
  Description d = made_up_page();
  d.suggestion.command += " --delimiter ';' --decimal , --bench /a/rather/long/folder/of/the/workshop/scope.toml";
  for (const Script script : {Script::utf8, Script::ascii}) {
    EXPECT_TRUE(contains(to_text(d, {.script = script, .width = 40}), "\n    " + d.suggestion.command + "\n"));
  }
}

TEST(DescribeText, WhatStandsInTheHeadAndTheDigestComeWithVerbose) {
  Description d = made_up_page();
  d.source.sha256 = std::string(64, 'b');
  EXPECT_FALSE(contains(to_text(d, {}), "bench scope"));
  const std::string page = to_text(d, {.verbose = true});
  EXPECT_TRUE(contains(page, "bench scope"));
  EXPECT_TRUE(contains(page, d.source.sha256));
}

TEST(DescribeText, IsPlainAsciiWhereUtf8IsNotKnown) {
  const std::string page = to_text(made_up_page(), {.script = Script::ascii});
  EXPECT_TRUE(std::all_of(page.begin(), page.end(), [](char c) { return static_cast<unsigned char>(c) < 0x80; }))
      << page;
}

TEST(DescribeText, ManyChannelsFitTheWidth) {
  Description d = made_up_page();
  d.channels.assign(9, d.channels[0]);
  std::istringstream page(to_text(d, {}));
  for (std::string line; std::getline(page, line);) EXPECT_LE(display_width(line), 80u) << line;
}

TEST(DescribeText, AFileOfNoKnownKindSaysSo) {
  Description d = made_up_page();
  d.suggestion = {};
  EXPECT_TRUE(contains(to_text(d, {}), "nothing this program has a test for"));
}

TEST(DescribeText, ASweepSaysItsFrequenciesAndQuantities) {
  Description d;
  d.kind = "sweep";
  d.source.name = "z.s2p";
  d.dialect.format = "touchstone";
  d.samples = 201;
  d.frequency_first_hz = 1e4, d.frequency_last_hz = 1e7;
  d.parameter = "S";
  d.ports = 2;
  d.reference_ohm = {50, 75};
  d.suggestion.looks_like = "impedance against frequency";
  const std::string page = to_text(d, {});
  for (const char* part :
       {"z.s2p: sweep of 201 points", "10.0000 kHz to 10.0000 MHz", "50 Ω, 75 Ω", "impedance against frequency"}) {
    EXPECT_TRUE(contains(page, part)) << part << "\n" << page;
  }
}

TEST(DescribeText, ManyFilesAreOneLineEach) {
  const std::vector<DescribedFile> files = {
      {"ring.csv", made_up_page()},
      {"broken.csv", failure(Problem::damaged, "broken.csv:17", "a row is cut off", "export it again")},
      {"gone.csv", failure(Problem::unreadable, "gone.csv", "there is no such file", "check the name")},
      {"again.csv", made_up_page()}};
  const std::string table = to_text(files, {});
  EXPECT_EQ(std::count(table.begin(), table.end(), '\n'), 5);
  EXPECT_TRUE(contains(table, "broken.csv  not read, line 17: a row is cut off\n")) << table;
  EXPECT_TRUE(contains(table, "gone.csv    not read: there is no such file\n")) << table;
  EXPECT_TRUE(contains(table, "2 (1 caution)"));
  EXPECT_TRUE(contains(table, "again.csv   waveform  20000    20 ns")) << table;
}

TEST(DescribeText, OutsideTextIsMadeVisible) {
  Description d = made_up_page();
  const std::string hostile = "a\x1b[2J\r\n";
  d.source.name = d.channels[0].name = hostile;
  d.dialect.settings = {{hostile, hostile}};
  d.segments = {{hostile, 1, 0}, {hostile, 1, 0}};
  const std::string page = to_text(d, {.verbose = true});
  EXPECT_EQ(page.find('\x1b'), std::string::npos);
  EXPECT_EQ(page.find('\r'), std::string::npos);
  const std::vector<DescribedFile> files = {{hostile, d},
                                            {hostile, failure(Problem::damaged, hostile + ":2", hostile, "")}};
  EXPECT_EQ(to_text(files, {}).find('\x1b'), std::string::npos);
}

}  // namespace
}  // namespace coilassay::test

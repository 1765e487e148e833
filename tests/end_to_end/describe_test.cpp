// The describe command as its users meet it.
#include <gtest/gtest.h>

#include <cmath>
#include <filesystem>
#include <nlohmann/json.hpp>
#include <sstream>

#include "tests/end_to_end/bench.h"
#include "tests/support/paths.h"

namespace coilassay::test {
namespace {

using Json = nlohmann::json;

Json described_json(std::vector<std::string> files, int exit_code = 0) {
  files.insert(files.begin(), "describe");
  files.push_back("--json");
  const ProgramEnd end = run_program_process(files);
  EXPECT_EQ(end.exit_code, exit_code) << end.error;
  EXPECT_EQ(end.signal, 0);
  EXPECT_EQ(schema_trouble(end.out, "describe"), "") << end.out;
  const Json document = Json::parse(end.out, nullptr, false);
  return document.is_discarded() ? Json::object() : document;
}

// What the simulator was told is the truth: 8 bits over 1.2 times the largest voltage, 2 mV of noise under a step of 32
// mV.
TEST(DescribeProgram, TellsOfASimulatedRingDownWhatTheSimulatorWasTold) {
  const TemporaryFolder folder;
  const std::string file = folder / "ring.csv";
  simulate_into(file,
                {"--noise", "2mV", "--bits", "8", "--full-scale", "4V", "--interval", "20ns", "--samples", "8000"});
  const Json d = described_json({file});
  EXPECT_EQ(d["kind"], "waveform");
  EXPECT_EQ(d["samples"], 8000);
  EXPECT_NEAR(d["sample_interval_s"].get<double>(), 20e-9, 1e-15);
  EXPECT_NEAR(d["start_s"].get<double>(), -800 * 20e-9, 1e-12);
  EXPECT_EQ(d["uniform"], true);
  const Json& channel = d["channels"][0];
  EXPECT_EQ(channel["unit"], "V");
  EXPECT_NEAR(channel["resolution"].get<double>(), 8.0 / 256, 1e-9);
  EXPECT_EQ(channel["noise_is_rounding"], true);
  EXPECT_NEAR(channel["noise"].get<double>(), std::hypot(2e-3, 8.0 / 256 / std::sqrt(12.0)), 1e-3);
  EXPECT_EQ(channel["clipped"], 0);
  EXPECT_EQ(d["suggestion"]["test"], "ringdown");
}

TEST(DescribeProgram, TheSuggestedCommandRunsAsItIs) {
  const TemporaryFolder folder;
  const std::string file = folder / "it's a ring; $HOME.csv";
  simulate_into(file, {"--noise", "2mV", "--drive-channel"});
  const std::string command = described_json({file})["suggestion"]["command"];
  ASSERT_TRUE(command.starts_with("coilassay ringdown ")) << command;
  const std::string out = folder / "out.json";
  const std::string line = "'" + program() + "'" + command.substr(9) + " --json > '" + out + "'";
  ASSERT_EQ(std::system(line.c_str()), 0) << line;
  EXPECT_TRUE(Json::parse(contents_of(out))["quantities"].contains("f_0"));
}

TEST(DescribeProgram, WhatIsSimulatedForATestIsSuggestedForIt) {
  const TemporaryFolder folder;
  for (const std::string test : {"sine", "ramp", "resistance"}) {
    const std::string file = folder / (test + ".csv");
    ASSERT_EQ(run_program_process({"simulate", test, "-o", file, "--truth", file + ".json"}).exit_code, 0);
    const Json suggestion = described_json({file})["suggestion"];
    EXPECT_EQ(suggestion["test"], test);
    const std::string command = suggestion["command"].is_null() ? "" : suggestion["command"].get<std::string>();
    ASSERT_TRUE(command.starts_with("coilassay " + test + " ")) << command;
    const std::string line = "'" + program() + "'" + command.substr(9) + " > '" + file + ".txt'";
    EXPECT_EQ(std::system(line.c_str()), 0) << line;
  }
}

TEST(DescribeProgram, APageForPeopleNamesTheCommandToRunNext) {
  const TemporaryFolder folder;
  const std::string file = folder / "ring.csv";
  simulate_into(file, {"--noise", "2mV"});
  const ProgramEnd end = run_program_process({"describe", file});
  EXPECT_EQ(end.exit_code, 0);
  EXPECT_EQ(end.error, "");
  EXPECT_NE(end.out.find("\n    coilassay ringdown " + file + "\n"), std::string::npos) << end.out;
}

TEST(DescribeProgram, AFileThatCannotBeReadDoesNotHideTheOthers) {
  const TemporaryFolder folder;
  const std::string good = folder / "good.csv", bad = folder.file("bad.csv", "no numbers here\n");
  simulate_into(good);
  const ProgramEnd table = run_program_process({"describe", good, bad, folder / "gone.csv", good});
  EXPECT_EQ(table.exit_code, 2);
  EXPECT_EQ(std::count(table.out.begin(), table.out.end(), '\n'), 5) << table.out;
  EXPECT_NE(table.out.find("gone.csv  not read: there is no such file"), std::string::npos) << table.out;

  const Json list = described_json({good, bad, good}, 2);
  EXPECT_EQ(list["schema"], "coilassay.describe-list/1");
  EXPECT_EQ(list["files"][0]["schema"], "coilassay.describe/1");
  EXPECT_EQ(list["files"][1]["schema"], "coilassay.error/1");
  EXPECT_EQ(list["files"][2]["file"], good);
}

TEST(DescribeProgram, OneFileThatCannotBeReadIsAnError) {
  const TemporaryFolder folder;
  const ProgramEnd end = run_program_process({"describe", folder.file("empty.csv", ""), "--json"});
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_EQ(schema_trouble(end.out, "error"), "");
}

TEST(DescribeProgram, ReadsStandardInputOnce) {
  const TemporaryFolder folder;
  simulate_into(folder / "ring.csv");
  const ProgramEnd end =
      run_program_process({.arguments = {"describe", "-", "--json"}, .input = contents_of(folder / "ring.csv")});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_EQ(Json::parse(end.out)["suggestion"]["command"], "coilassay ringdown -");
  EXPECT_EQ(run_program_process({"describe", "-", "-"}).exit_code, 2);
}

TEST(DescribeProgram, AReadingKeyIsABenchSheetThatReadsTheFileAgain) {
  const TemporaryFolder folder;
  std::ostringstream text;
  text << "Zeit [us];U [V]\n";
  for (int i = 0; i < 400; ++i) {
    const double v = std::exp(-i / 90.0) * std::cos(0.5 * i);
    std::string row = std::to_string(0.5 * i) + ";" + std::to_string(v) + "\n";
    std::replace(row.begin(), row.end(), '.', ',');
    text << row;
  }
  const std::string file = folder.file("zeit.csv", text.str()), sheet = folder / "scope.toml";
  const ProgramEnd first = run_program_process({"describe", file, "--bench-out", sheet});
  EXPECT_EQ(first.exit_code, 0) << first.error;
  const std::string written = contents_of(sheet);
  EXPECT_NE(written.find("delimiter = \";\"\ndecimal = \",\"\n"), std::string::npos) << written;
  EXPECT_NE(written.find("columns = [\"Zeit [us]\", \"U [V]\"]\n"), std::string::npos) << written;
  EXPECT_NE(written.find("# column = \"U\""), std::string::npos) << written;

  const Json again = described_json({file, "--bench", sheet});
  EXPECT_EQ(again["samples"], 400);
  EXPECT_EQ(again["suggestion"]["command"], "coilassay ringdown " + file + " --bench " + sheet);

  // A file whose columns changed places no longer fits.
  std::string other = text.str();
  other.replace(0, other.find('\n'), "U [V];Zeit [us]");
  const ProgramEnd changed = run_program_process({"describe", folder.file("other.csv", other), "--bench", sheet});
  EXPECT_EQ(changed.exit_code, 2);
  EXPECT_NE(changed.error.find("column 1 is 'U' where the reading key names 'Zeit'"), std::string::npos) << changed.error;

  const ProgramEnd second = run_program_process({"describe", file, "--bench-out", sheet});
  EXPECT_EQ(second.exit_code, 2);
  EXPECT_EQ(contents_of(sheet), written);
}

// Every table among the readers' own files: with the key that was made of it, it is described as without.
TEST(DescribeProgram, TheReadingKeyOfATableReadsItTheSameWay) {
  std::size_t with_columns = 0;
  for (const auto& entry : std::filesystem::directory_iterator("tests/acquire/data")) {
    const std::string file = entry.path().string();
    if (file.ends_with(".wav")) continue;
    const TemporaryFolder folder;
    const std::string sheet = folder / "key.toml";
    const ProgramEnd made = run_program_process({"describe", file, "--bench-out", sheet});
    if (made.exit_code != 0) continue;  // no table with a key
    with_columns += contents_of(sheet).find("columns = [") != std::string::npos ? 1u : 0u;
    Json plain = described_json({file}), keyed = described_json({file, "--bench", sheet});
    plain.erase("suggestion");
    keyed.erase("suggestion");
    EXPECT_EQ(plain, keyed) << file << "\n" << contents_of(sheet);
  }
  EXPECT_GT(with_columns, 8u);
}

TEST(DescribeProgram, AReadingKeyIsForOneTableOnly) {
  const TemporaryFolder folder;
  simulate_into(folder / "ring.csv");
  const std::string sheet = folder / "scope.toml";
  EXPECT_EQ(run_program_process({"describe", folder / "ring.csv", folder / "ring.csv", "--bench-out", sheet}).exit_code,
            2);
  EXPECT_EQ(run_program_process({"describe", folder / "ring.csv", "--bench-out", "-"}).exit_code, 2);
  const std::string touchstone = folder.file("z.s1p", "# MHz Z RI R 1\n1 0.1 6.28\n2 0.1 12.57\n");
  EXPECT_EQ(run_program_process({"describe", touchstone, "--bench-out", sheet}).exit_code, 2);
  EXPECT_FALSE(std::filesystem::exists(sheet));
}

TEST(DescribeProgram, ASweepIsToldFromAWaveform) {
  const TemporaryFolder folder;
  const Json d = described_json({folder.file("z.s1p", "# MHz S RI R 50\n1 0.1 0.2\n2 0.1 0.3\n3 0.2 0.3\n")});
  EXPECT_EQ(d["kind"], "sweep");
  EXPECT_EQ(d["samples"], 3);
  EXPECT_EQ(d["frequency_first_Hz"], 1e6);
  EXPECT_EQ(d["frequency_last_Hz"], 3e6);
  EXPECT_EQ(d["parameter"], "S");
  EXPECT_EQ(d["ports"], 1);
  EXPECT_EQ(d["reference_ohm"], Json::array({50.0}));
}

}  // namespace
}  // namespace coilassay::test

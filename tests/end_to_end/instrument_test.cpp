// Instruments as the program's users meet them: simulate instrument, acquire, acquire --try.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <csignal>
#include <filesystem>
#include <memory>
#include <nlohmann/json.hpp>
#include <thread>

#include "tests/end_to_end/bench.h"
#include "tests/support/background_program.h"
#include "tests/support/paths.h"

namespace coilassay::test {
namespace {

using Json = nlohmann::json;
using testing::HasSubstr;
using testing::Not;

/// The text with every `from` replaced.
std::string with(std::string text, const std::string& from, const std::string& to) {
  for (std::size_t at = 0; (at = text.find(from, at)) != std::string::npos; at += to.size()) text.replace(at, from.size(), to);
  return text;
}

std::string sample(const std::string& name) { return contents_of(project_file("sample-data/instruments/" + name)); }

/// A sample profile on a port, quick enough for a test.
std::string meter_on(const std::string& port) {
  return with(with(with(sample("meter.toml"), "localhost:5025", "localhost:" + port), "timeout = \"2 s\"", "timeout = \"200 ms\"\nreconnect = \"500 ms\""),
              "lateness = \"1 s\"", "lateness = \"50 ms\"");
}

struct Meter {
  explicit Meter(std::vector<std::string> more = {}) : simulated(folder.file("any.toml", meter_on("1")), std::move(more)) {
    profile = folder.file("meter.toml", meter_on(simulated.port()));
  }
  TemporaryFolder folder;
  SimulatedInstrument simulated;
  std::string profile;
};

TEST(AcquireProgram, WritesReadingsThatDescribeReads) {
  Meter meter;
  const std::string file = meter.folder / "run.csv";
  const ProgramEnd end = run_program_process({"acquire", meter.profile, "-o", file, "--count", "5", "--every", "20ms", "--json"});
  ASSERT_EQ(end.exit_code, 0) << end.error;
  EXPECT_EQ(schema_trouble(end.out, "acquire"), "") << end.out;
  const Json summary = Json::parse(end.out);
  EXPECT_EQ(summary["readings"], 5);
  EXPECT_EQ(summary["without_value"], 0);
  EXPECT_THAT(summary["instrument"], HasSubstr("bench-lcr"));
  EXPECT_EQ(summary["settings"]["frequency"], "+1.00000E+05");
  EXPECT_THAT(contents_of(file), HasSubstr("instrument,\"Skerry Buoy Works,bench-lcr"));
  const ProgramEnd described = run_program_process({"describe", file, "--json"});
  ASSERT_EQ(described.exit_code, 0) << described.error;
  const Json d = Json::parse(described.out);
  EXPECT_EQ(d["samples"], 5);
  EXPECT_EQ(d["channels"][0]["name"], "L_s");
  // 47 uH is what the stand-in measures unless told otherwise.
  EXPECT_NEAR(d["channels"][0]["first"].get<double>(), 47e-6, 1e-9);
}

TEST(AcquireProgram, AFileWithoutOneValueIsNoSuccess) {
  const auto acquired = [](const Meter& meter, const std::string& profile) {
    return run_program_process({"acquire", profile, "-o", meter.folder / "run.csv", "--count", "2"});
  };
  Meter over({"--over-range", "1"});
  const ProgramEnd all_over = acquired(over, over.profile);
  EXPECT_EQ(all_over.exit_code, 3);
  EXPECT_THAT(all_over.error, HasSubstr("no value was measured: all 2 readings came without one"));

  // The status is not the one that says the values may be used.
  Meter fine;
  const ProgramEnd status = acquired(fine, fine.folder.file("status.toml", with(contents_of(fine.profile), "status = \"0\"", "status = \"7\"")));
  EXPECT_EQ(status.exit_code, 3) << status.error;

  // Another number of fields than the profile states: no reply can be read.
  Meter other;
  const ProgramEnd fields = acquired(other, other.folder.file("fields.toml", with(contents_of(other.profile), "\"status\"]", "\"status\", \"Q\"]")));
  EXPECT_EQ(fields.exit_code, 4) << fields.error;
  EXPECT_THAT(fields.error, HasSubstr("no value was measured: all 2 readings failed, the last because"));
  EXPECT_TRUE(std::filesystem::exists(other.folder / "run.csv"));
}

// A simulated coil of 1 mH and 2 ohm, sampled by the stand-in, fetched as blocks, measured: the truth is what it was told.
TEST(AcquireProgram, AWaveformFetchedAsBlocksIsMeasuredBySine) {
  const TemporaryFolder folder;
  const std::string text = with(sample("digitiser.toml"), "lateness = \"1 s\"", "lateness = \"20 ms\"");
  SimulatedInstrument digitiser(folder.file("any.toml", text), {"--inductance", "1mH", "--resistance", "2ohm", "--frequency", "10kHz"});
  const std::string profile = folder.file("digitiser.toml", with(text, "5026", digitiser.port()));
  const std::string file = folder / "sine.csv";
  const ProgramEnd end = run_program_process({"acquire", profile, "-o", file, "--json"});
  ASSERT_EQ(end.exit_code, 0) << end.error;
  EXPECT_EQ(schema_trouble(end.out, "acquire"), "") << end.out;
  const Json result = measured_json({"sine", file, "--voltage", "V", "--current", "I"});
  EXPECT_TRUE(covers(result, "L_s", 1e-3));
  EXPECT_TRUE(covers(result, "R_s", 2));
}

TEST(AcquireProgram, SeveralRecordsBecomeSegments) {
  const TemporaryFolder folder;
  const std::string text = with(with(sample("digitiser.toml"), "lateness = \"1 s\"", "lateness = \"20 ms\""), "block int16", "rows");
  SimulatedInstrument digitiser(folder.file("any.toml", text), {"--frequency", "10kHz"});
  const std::string profile = folder.file("digitiser.toml", with(text, "5026", digitiser.port()));
  const std::string file = folder / "three.csv";
  ASSERT_EQ(run_program_process({"acquire", profile, "-o", file, "--count", "3"}).exit_code, 0);
  const Json d = Json::parse(run_program_process({"describe", file, "--json"}).out);
  EXPECT_EQ(d["segments"].size(), 3u);
  EXPECT_EQ(d["segments"][2]["label"], "Segment 3");
  EXPECT_EQ(d["segments"][2]["samples"], 5000);
}

TEST(AcquireProgram, TryWalksThroughTheProfile) {
  Meter meter;
  const ProgramEnd end = run_program_process({"acquire", meter.profile, "--try"});
  ASSERT_EQ(end.exit_code, 0) << end.error;
  for (const char* part : {"sent  *IDN?\\n", "came  Skerry Buoy Works,bench-lcr", "sent  FETC?\\n", "L_s: 47.00000 µH", "status: 0 (all is well)", "The profile works."}) {
    EXPECT_THAT(end.out, HasSubstr(part));
  }
  const ProgramEnd json = run_program_process({"acquire", meter.profile, "--try", "--json"});
  EXPECT_EQ(schema_trouble(json.out, "try"), "") << json.out;
}

TEST(AcquireProgram, TrySaysWhereItGoesWrong) {
  Meter meter, echoing({"--echo"});
  struct Case {
    std::string profile, finding;
  };
  const std::string good = contents_of(meter.profile);
  const Case cases[] = {
      {with(good, "expect = \"bench-lcr\"", "expect = \"other\""), "where 'other' is expected"},
      {with(good, "\"status\"]", "\"status\", \"Q\"]"), "4 are stated"},
      {with(good, "\"R_s [ohm]\", \"status\"", "\"status\", \"R_s [ohm]\""), "not 0: values would not be used"},
      {with(good, "ask = \"FETC?\"", "ask = \"NONE?\""), "no reply within 200 ms"},
      {with(good, "lateness", "reply_terminator = \"\\r\"\nlateness"), "no terminator"},
      {contents_of(echoing.profile), "write echo = true"},
      {with(good, "localhost:" + meter.simulated.port(), "localhost:1"), "nobody listens there"},
  };
  for (const Case& each : cases) {
    const ProgramEnd end = run_program_process({"acquire", meter.folder.file("bad.toml", each.profile), "--try"});
    EXPECT_THAT(end.out, HasSubstr(each.finding)) << each.profile << end.error;
    if (each.finding.find("values would") == std::string::npos) {
      EXPECT_EQ(end.exit_code, 4) << each.finding;
      EXPECT_THAT(end.out, HasSubstr("here it goes wrong: ")) << end.out;
    }
  }
}

TEST(AcquireProgram, RefusesAProfileThatCannotBe) {
  const TemporaryFolder folder;
  struct Case {
    std::string text;
    const char* finding;
  };
  const std::string good = sample("meter.toml");
  const Case cases[] = {{good + "colour = \"red\"\n", "unknown key 'colour'"},
                        {with(with(good, "short_below = { L_s = \"100 nH\" }\n", ""), "L_s [H]", "L_s [ohm]"), "L_s is an inductance (H)"},
                        {with(good, "bench-lcr", "bench-(lcr"), "cannot be used"},
                        {with(good, "timeout = \"2 s\"", "terminator = \"\""), "where a reply ends"}};
  for (const Case& each : cases) {
    const ProgramEnd end = run_program_process({"acquire", folder.file("bad.toml", each.text), "-o", folder / "x.csv", "--json"});
    EXPECT_EQ(end.exit_code, 2) << each.finding;
    EXPECT_EQ(schema_trouble(end.out, "error"), "") << end.out;
    EXPECT_THAT(end.out, HasSubstr(each.finding));
    EXPECT_FALSE(std::filesystem::exists(folder / "x.csv"));
  }
}

TEST(AcquireProgram, DoesNotOverwriteWhatWasMeasured) {
  Meter meter;
  const std::string file = meter.folder.file("run.csv", "precious\n");
  const ProgramEnd end = run_program_process({"acquire", meter.profile, "-o", file, "--count", "1"});
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_EQ(contents_of(file), "precious\n");
}

TEST(AcquireProgram, AKillKeepsTheRowsThatCame) {
  Meter meter;
  const std::string file = meter.folder / "run.csv";
  BackgroundProgram running({"acquire", meter.profile, "-o", file, "--every", "5ms"});
  for (int i = 0; i < 400 && !std::filesystem::exists(file); ++i) std::this_thread::sleep_for(std::chrono::milliseconds(10));
  std::this_thread::sleep_for(std::chrono::milliseconds(500));
  running.send(SIGKILL);
  running.exit_code();
  const Json d = Json::parse(run_program_process({"describe", file, "--json"}).out);
  EXPECT_GT(d["samples"].get<int>(), 5) << contents_of(file);
}

TEST(AcquireProgram, CtrlCEndsItWithASummary) {
  Meter meter;
  const std::string file = meter.folder / "run.csv";
  BackgroundProgram running({"acquire", meter.profile, "-o", file, "--every", "5ms", "--json"});
  for (int i = 0; i < 400 && !std::filesystem::exists(file); ++i) std::this_thread::sleep_for(std::chrono::milliseconds(10));
  std::this_thread::sleep_for(std::chrono::milliseconds(300));
  running.send(SIGINT);
  const Json summary = Json::parse(running.rest());
  EXPECT_EQ(running.exit_code(), 0);
  EXPECT_EQ(summary["stopped"], true);
  EXPECT_GT(summary["readings"].get<int>(), 0);
}

TEST(AcquireProgram, AnInstrumentThatIsGoneForGoodEndsItWithFourAndKeepsTheRows) {
  auto meter = std::make_unique<Meter>();
  const TemporaryFolder kept;
  const std::string file = kept / "run.csv";
  const std::string profile = kept.file("meter.toml", contents_of(meter->profile));
  BackgroundProgram running({"acquire", profile, "-o", file, "--every", "5ms", "--json"});
  // Until some readings are there, however long a busy machine takes for them.
  const auto lines = [&] {
    const std::string text = std::filesystem::exists(file) ? contents_of(file) : std::string();
    return std::count(text.begin(), text.end(), '\n');
  };
  for (int i = 0; i < 3000 && lines() < 25; ++i) std::this_thread::sleep_for(std::chrono::milliseconds(10));
  meter.reset();
  const std::string out = running.rest();
  EXPECT_EQ(running.exit_code(), 4);
  EXPECT_EQ(schema_trouble(out, "error"), "") << out;
  EXPECT_EQ(Json::parse(out)["problem"], "instrument");
  EXPECT_THAT(out, HasSubstr("are kept in"));
  EXPECT_GT(Json::parse(run_program_process({"describe", file, "--json"}).out)["samples"].get<int>(), 3);
}

TEST(AcquireProgram, ATraceIsPlayedAgain) {
  Meter meter;
  const std::string trace = meter.folder / "talk.trace";
  ASSERT_EQ(run_program_process({"acquire", meter.profile, "-o", meter.folder / "live.csv", "--count", "3", "--trace", trace}).exit_code, 0);
  EXPECT_THAT(contents_of(trace), HasSubstr("> FETC?\\n"));
  const std::string played = meter.folder.file("played.toml", with(with(contents_of(meter.profile), "kind = \"tcp\"", "kind = \"recorded\""),
                                                                   "localhost:" + meter.simulated.port(), "talk.trace"));
  const ProgramEnd end = run_program_process({"acquire", played, "-o", meter.folder / "again.csv", "--count", "3"});
  ASSERT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(contents_of(meter.folder / "again.csv"), HasSubstr("4.7e-05,0.35"));
}

TEST(AcquireProgram, AnInstrumentThatPrintsByItselfIsRead) {
  const TemporaryFolder folder;
  const std::string text = with(with(sample("line-printer.toml"), "baud = 115200", "kind = \"tcp\""), "/dev/serial/by-id/usb-coil-printer", "localhost:1");
  SimulatedInstrument printer(folder.file("any.toml", text), {"--every", "20ms"});
  const std::string profile = folder.file("printer.toml", with(text, "localhost:1", "localhost:" + printer.port()));
  const std::string file = folder / "run.csv";
  const ProgramEnd end = run_program_process({"acquire", profile, "-o", file, "--count", "4"});
  ASSERT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(contents_of(file), HasSubstr("4.7e-05,0.35"));
}

// The whole program on a serial line: socat makes a pseudo-terminal of the stand-in's TCP port.
TEST(AcquireProgram, ReadsASerialPort) {
  Meter meter;
  const std::string port = meter.folder / "serial";
  const std::string end_a = "pty,raw,echo=0,link=" + port, end_b = "tcp:localhost:" + meter.simulated.port();
  const pid_t socat = fork();
  if (socat == 0) {
    execlp("socat", "socat", end_a.c_str(), end_b.c_str(), static_cast<char*>(nullptr));
    _exit(127);
  }
  for (int i = 0; i < 500 && !std::filesystem::exists(port); ++i) std::this_thread::sleep_for(std::chrono::milliseconds(10));
  const std::string profile = meter.folder.file("serial.toml", with(with(contents_of(meter.profile), "kind = \"tcp\"", "kind = \"serial\"\nbaud = 115200"),
                                                                    "localhost:" + meter.simulated.port(), port));
  ProgramStart start;
  start.arguments = {"acquire", profile, "-o", meter.folder / "run.csv", "--count", "3"};
  const std::string shim = std::filesystem::path(program()).parent_path().string() + "/libpty_shim.so";
  ASSERT_TRUE(std::filesystem::exists(shim));
  start.environment = {"LD_PRELOAD=" + std::filesystem::absolute(shim).string(), "ASAN_OPTIONS=verify_asan_link_order=0"};
  const ProgramEnd end = run_program_process(start);
  kill(socat, SIGTERM);
  waitpid(socat, nullptr, 0);
  ASSERT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(contents_of(meter.folder / "run.csv"), HasSubstr("4.7e-05,0.35"));
}

TEST(SimulateInstrumentProgram, ListensOnThisMachineOnly) {
  const TemporaryFolder folder;
  const std::string profile = folder.file("meter.toml", sample("meter.toml"));
  for (const char* address : {"0.0.0.0:5025", "192.0.2.1:5025", "5025", "localhost:99999"}) {
    const ProgramEnd end = run_program_process({"simulate", "instrument", profile, "--listen", address});
    EXPECT_EQ(end.exit_code, 2) << address;
    EXPECT_THAT(end.error, HasSubstr("--listen")) << address;
  }
}

TEST(SimulateInstrumentProgram, AnotherIdentityAfterADropIsRefused) {
  Meter meter({"--gone", "30%", "--another-identity"});
  const ProgramEnd end = run_program_process({"acquire", meter.profile, "-o", meter.folder / "run.csv", "--count", "200"});
  EXPECT_EQ(end.exit_code, 4);
  EXPECT_THAT(end.error, HasSubstr("another instrument answers"));
}

}  // namespace
}  // namespace coilassay::test

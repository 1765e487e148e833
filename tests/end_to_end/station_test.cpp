// The station as its users meet it: scanner lines in, verdicts out, a ledger that has them first.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <chrono>
#include <memory>
#include <nlohmann/json.hpp>
#include <string>
#include <thread>

#include "tests/end_to_end/bench.h"
#include "tests/support/background_program.h"
#include "tests/support/paths.h"
#include "tests/support/station_kills.h"

namespace coilassay::test {
namespace {

using Json = nlohmann::json;
using testing::HasSubstr;
using testing::Not;

struct Shop {
  explicit Shop(std::vector<std::string> more = {})
      : meter(std::make_unique<SimulatedInstrument>(folder.file("any.toml", meter_text("1")), std::move(more))) {
    profile = folder.file("meter.toml", meter_text(meter->port()));
    sheet = folder.file("part.toml",
                        "[part]\nname = \"drum-47\"\nrevision = \"C\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"45 uH\"\nmax = \"49 uH\"\ntest = \"reading\"\n"
                        "at = { frequency = \"100 kHz\" }\n");
  }
  static std::string meter_text(const std::string& port) {
    return "[link]\nkind = \"tcp\"\nport = \"localhost:" + port +
           "\"\ntimeout = \"100 ms\"\nlateness = \"20 ms\"\nreconnect = \"400 ms\"\n[identity]\nexpect = \"lcr\"\n"
           "[reading]\nask = \"FETC?\"\nfields = [\"L_s [H]\", \"R_s [ohm]\", \"status\"]\nat = { frequency = \"100 kHz\" }\naccuracy = { L_s = \"0.2 %\" }\n";
  }
  std::vector<std::string> words(std::vector<std::string> more = {}) const {
    std::vector<std::string> all{"station", sheet, "--instrument", profile, "--lot", "0412", "--ledger", folder / "d.ledger"};
    all.insert(all.end(), more.begin(), more.end());
    return all;
  }
  ProgramEnd run(const std::string& input, std::vector<std::string> more = {}) const {
    ProgramStart start;
    start.arguments = words(std::move(more));
    start.input = input;
    return run_program_process(start);
  }
  TemporaryFolder folder;
  std::unique_ptr<SimulatedInstrument> meter;
  std::string profile, sheet;
};

TEST(StationProgram, PlainLinesWhereThereIsNoTerminal) {
  Shop shop;
  const ProgramEnd end = shop.run("0001\n0002\n");
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("0001 passes  L_s 47.000 µH ± 0.089 µH (45 µH to 49 µH)\n0002 passes"));
  EXPECT_THAT(end.out, HasSubstr("Accepted: lot 0412 of drum-47"));
  EXPECT_THAT(end.out, Not(HasSubstr("\x1b"))) << "no control characters off the terminal";
  EXPECT_THAT(end.out, Not(HasSubstr("\a")));
}

TEST(StationProgram, OneDocumentAtTheEnd) {
  Shop shop;
  const ProgramEnd end = shop.run("0001\n0002\n", {"--json", "--operator", "Ada", "--lot-size", "2"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_EQ(schema_trouble(end.out, "lot"), "") << end.out;
  const Json lot = Json::parse(end.out);
  EXPECT_EQ(lot["lot"], "0412");
  EXPECT_EQ(lot["units"].size(), 2u);
  EXPECT_EQ(lot["decision"], "accept");
  EXPECT_EQ(lot["ledger"]["last"], 3);
  EXPECT_THAT(end.error, HasSubstr("0001 passes")) << "the operator still sees something";
}

TEST(StationProgram, FollowWritesALineForEachUnitAndTheLotLast) {
  Shop shop;
  BackgroundProgram station(shop.words({"--follow"}));
  station.say("0001\n");
  const std::string first = station.line().value_or("");
  EXPECT_EQ(schema_trouble(first, "unit"), "") << first;
  EXPECT_EQ(Json::parse(first)["serial"], "0001");
  EXPECT_EQ(Json::parse(first)["verdict"], "pass");
  station.say("0001\n0002\n:quit\n");
  const std::string second = station.line().value_or("");
  EXPECT_EQ(Json::parse(second)["serial"], "0002") << "the duplicate stopped";
  const std::string lot = station.line().value_or("");
  EXPECT_EQ(schema_trouble(lot, "lot"), "") << lot;
  EXPECT_EQ(station.exit_code(), 0);
  EXPECT_THAT(station.error_text(), HasSubstr("it was inspected already"));
}

TEST(StationProgram, NothingIsAskedBeforeTheFirstSerial) {
  Shop shop;
  const std::string trace = shop.folder / "talk.trace";
  EXPECT_EQ(shop.run("", {"--trace", trace}).exit_code, 3);
  EXPECT_THAT(contents_of(trace), Not(HasSubstr("FETC?")));
  shop.run("0001\n", {"--trace", trace});
  const std::string talk = contents_of(trace);
  std::size_t asked = 0;
  for (std::size_t at = talk.find("> FETC?"); at != std::string::npos; at = talk.find("> FETC?", at + 1)) ++asked;
  EXPECT_EQ(asked, 1u) << "one reading a unit";
}

TEST(StationProgram, AnInstrumentGoneForGoodEndsItWithFourAndTheLedgersHead) {
  Shop shop;
  BackgroundProgram station(shop.words({"--json"}));
  station.say("0001\n");
  // --json shows nothing until the end: the operator's lines go to standard error.
  for (int i = 0; i < 200 && station.error_text().find("0001 passes") == std::string::npos; ++i) std::this_thread::sleep_for(std::chrono::milliseconds(20));
  shop.meter.reset();
  station.say("0002\n");
  const std::string out = station.rest();
  EXPECT_EQ(station.exit_code(), 4);
  EXPECT_EQ(schema_trouble(out, "error"), "") << out;
  const Json error = Json::parse(out);
  EXPECT_EQ(error["problem"], "instrument");
  EXPECT_EQ(error["ledger"]["last"], 1);
  const ProgramEnd verified = run_program_process({"ledger", "verify", shop.folder / "d.ledger"});
  EXPECT_EQ(verified.exit_code, 0);
  EXPECT_THAT(verified.out, HasSubstr(error["ledger"]["head"].get<std::string>()));
}

TEST(StationProgram, WithoutAnInstrumentItDoesNotBegin) {
  Shop shop;
  shop.meter.reset();
  const ProgramEnd end = shop.run("0001\n", {"--json"});
  EXPECT_EQ(end.exit_code, 4);
  EXPECT_EQ(schema_trouble(end.out, "error"), "") << end.out;
}

TEST(StationProgram, SaysWhatIsMissingOnTheCommandLine) {
  Shop shop;
  for (const auto& [without, remedy] : {std::pair{"--instrument", "meter.toml"}, {"--lot", "0412"}, {"--ledger", "drum-47.ledger"}}) {
    std::vector<std::string> words = shop.words();
    const auto at = std::find(words.begin(), words.end(), without);
    words.erase(at, at + 2);
    const ProgramEnd end = run_program_process(words);
    EXPECT_EQ(end.exit_code, 2) << without;
    EXPECT_THAT(end.error, HasSubstr(std::string(without) + ":")) << end.error;
    EXPECT_THAT(end.error, HasSubstr(remedy));
  }
}

TEST(StationProgram, ARecordOfReadingsIsNotTakenForCaptures) {
  Shop shop;
  shop.run("0001\n");
  const ProgramEnd listed = run_program_process({"ledger", "list", shop.folder / "d.ledger", "--json"});
  EXPECT_EQ(schema_trouble(listed.out, "ledger"), "") << listed.out;
  const Json unit = Json::parse(listed.out)["entries"][0];
  EXPECT_THAT(unit["instrument"], HasSubstr("lcr"));
  EXPECT_EQ(unit["sources"].size(), 0u);
}

// A sample of the claim that tests/proof/station_kills.cpp makes at full size.
TEST(StationProgram, TwentyKillsLoseNoVerdictThatWasShown) {
  const StationKills result = kill_station(20, 3);
  EXPECT_EQ(result.kills, 20);
  EXPECT_EQ(result.not_in_ledger, 0u);
  EXPECT_EQ(result.shown_twice, 0u);
  EXPECT_TRUE(result.chain_holds);
  EXPECT_GT(result.shown, 10u) << "otherwise nothing was tried";
}

}  // namespace
}  // namespace coilassay::test

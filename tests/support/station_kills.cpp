#include "tests/support/station_kills.h"

#include <chrono>
#include <csignal>
#include <map>
#include <nlohmann/json.hpp>
#include <set>
#include <thread>

#include "tests/support/background_program.h"
#include "tests/support/program.h"

namespace coilassay::test {

namespace {

using Json = nlohmann::json;

constexpr const char* kSheet =
    "[part]\nname = \"drum-47\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"45 uH\"\nmax = \"49 uH\"\ntest = \"reading\"\n";

std::string profile_text(const std::string& port) {
  return "[link]\nkind = \"tcp\"\nport = \"localhost:" + port +
         "\"\ntimeout = \"200 ms\"\nlateness = \"5 ms\"\nquiet = \"1 ms\"\n"
         "[identity]\nexpect = \"lcr\"\n[reading]\nask = \"FETC?\"\nfields = [\"L_s [H]\", \"R_s [ohm]\", \"status\"]\naccuracy = { L_s = \"0.1 %\" }\n";
}

}  // namespace

StationKills kill_station(int kills, std::uint64_t seed) {
  const TemporaryFolder folder;
  SimulatedInstrument meter(folder.file("any.toml", profile_text("1")), {"--spread", "3%", "--seed", std::to_string(seed)});
  const std::string profile = folder.file("meter.toml", profile_text(meter.port()));
  const std::string sheet = folder.file("part.toml", kSheet), ledger = folder / "d.ledger";
  StationKills result;
  std::map<std::string, std::string> shown;
  std::uint64_t state = seed * 2654435761u + 1;
  int serial = 0;
  while (result.kills < kills) {
    BackgroundProgram station({"station", sheet, "--instrument", profile, "--lot", "7", "--ledger", ledger, "--follow", "--quiet"});
    state = state * 6364136223846793005u + 1442695040888963407u;
    // After so many verdicts, and then a little later, in the middle of whatever it does next; with none, from the start on.
    const std::size_t verdicts = (state >> 60) & 7;
    const auto later = std::chrono::microseconds((state >> 33) % (verdicts == 0 ? 60'000 : 12'000));
    // A scanner types ahead; what was not seen is scanned again by the next one.
    std::string typed;
    const int first = serial;
    for (int i = 0; i < 60; ++i) typed += std::to_string(first + i) + "\n";
    station.say(typed);
    int next = first;
    const auto take = [&](const std::string& line) {
      const Json unit = Json::parse(line, nullptr, false);
      if (unit.is_discarded() || unit.value("schema", "") != "coilassay.unit/1") return;  // a line the kill cut is not shown
      const std::string name = unit["serial"];
      if (!shown.emplace(name, unit["verdict"]).second) ++result.shown_twice;
      next = std::stoi(name) + 1;
    };
    for (std::size_t i = 0; i < verdicts; ++i) {
      if (const auto line = station.line(std::chrono::seconds(30))) take(*line);
    }
    std::this_thread::sleep_for(later);
    station.send(SIGKILL);
    while (const auto line = station.line(std::chrono::seconds(30))) take(*line);
    station.exit_code();
    ++result.kills;
    serial = next;
  }
  result.shown = shown.size();
  const ProgramEnd verified = run_program_process({"ledger", "verify", ledger});
  result.chain_holds = verified.exit_code == 0;
  const Json listed = Json::parse(run_program_process({"ledger", "list", ledger, "--json"}).out, nullptr, false);
  std::map<std::string, std::string> recorded;
  if (listed.is_object()) {
    for (const Json& entry : listed["entries"]) {
      if (entry["kind"] == "unit" && entry["attempt"] == 1) recorded[entry["serial"]] = entry["verdict"];
    }
  }
  result.recorded = recorded.size();
  for (const auto& [name, verdict] : shown) {
    const auto found = recorded.find(name);
    if (found == recorded.end() || found->second != verdict) ++result.not_in_ledger;
  }
  return result;
}

}  // namespace coilassay::test

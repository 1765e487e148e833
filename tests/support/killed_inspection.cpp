#include "tests/support/killed_inspection.h"

#include <chrono>
#include <csignal>
#include <filesystem>
#include <map>
#include <nlohmann/json.hpp>
#include <set>
#include <sstream>
#include <thread>
#include <unistd.h>

#include "base/random.h"
#include "ledger/ledger.h"
#include "tests/support/background_program.h"
#include "tests/support/program.h"

namespace coilassay::test {

namespace {

using Json = nlohmann::json;

class KilledLot {
 public:
  KilledLot(int units, std::uint64_t seed) : units_(units), random_(seed) {
    std::filesystem::create_directory(folder_ / "lot");
    folder_.file("part.toml", "[part]\nname = \"drum-47\"\n[[limit]]\nquantity = \"f_0\"\nmin = \"100 kHz\"\nmax = \"300 kHz\"\n");
    for (int i = 0; i < units; ++i) {
      run_program_process({"simulate", "ringdown", "-o", folder_ / ("lot/" + std::to_string(i + 1) + ".ringdown.csv"), "--seed",
                           std::to_string(i + 1), "--samples", "1500", "--interval", "80ns", "--noise", "2mV", "--quiet"});
    }
  }

  InspectionKills kill(int kills) {
    // A run that always ended before its kill would never come to an end here.
    for (int runs = 0; tally_.kills < kills && runs < 20 * kills && tally_.trouble.empty(); ++runs) run_once();
    return tally_;
  }

 private:
  std::string ledger() const { return folder_ / ("ledger-" + std::to_string(tally_.finished)); }

  void run_once() {
    BackgroundProgram program({"inspect", folder_ / "part.toml", folder_ / "lot", "--ledger", ledger(), "--follow"});
    const auto lines = static_cast<int>(static_cast<double>(units_ + 5) * random_.uniform());
    std::string text;
    for (int i = 0; i < lines; ++i) {
      const auto line = program.line();
      if (!line) break;
      text += *line + '\n';
    }
    std::this_thread::sleep_for(std::chrono::microseconds(static_cast<int>(40e3 * random_.uniform())));
    program.send(SIGKILL);
    text += program.rest();
    take(text);
    if (program.exit_code() == -1) {
      ++tally_.kills;
      look();
    } else {
      finish();
    }
  }

  /// What was told: whole lines only, the last one may be cut.
  void take(const std::string& text) {
    for (std::size_t begin = 0; begin < text.size();) {
      const std::size_t end = text.find('\n', begin);
      if (end == std::string::npos) return;
      const Json line = Json::parse(text.substr(begin, end - begin), nullptr, false);
      begin = end + 1;
      if (!line.is_object()) {
        tally_.trouble = "a line is no JSON";
        return;
      }
      if (line.value("schema", "") != "coilassay.unit/1") continue;
      const auto id = line.at("entry").get<std::int64_t>();
      if (!line.at("from_ledger").get<bool>()) ++tally_.acknowledged;
      told_[id] = {line.at("serial"), line.at("verdict")};
    }
  }

  void look() {
    if (told_.empty() && ::access(ledger().c_str(), F_OK) != 0) return;
    const auto opened = Ledger::open({.path = ledger()});
    if (!opened) {
      tally_.trouble = opened.error().finding;
      return;
    }
    const auto check = opened->verify();
    if (!check) tally_.trouble = check.error().finding;
    else if (!check->holds()) tally_.trouble = check->faults[0].what;
    for (const auto& [id, unit] : told_) {
      const auto entry = opened->entry(id);
      if (!entry || entry->content.serial != unit.first || entry->content.verdict != unit.second) {
        tally_.trouble = "entry " + std::to_string(id) + " is not what was acknowledged";
      }
    }
  }

  /// The decision was reached: every unit is there once, whatever was killed before. The next run begins anew.
  void finish() {
    look();
    const auto opened = Ledger::open({.path = ledger()});
    const auto entries = opened ? opened->find({.kind = EntryKind::unit}) : Result<std::vector<Entry>>(failure(opened));
    std::set<std::string> serials;
    if (entries) {
      for (const Entry& entry : *entries) serials.insert(entry.content.serial);
    }
    const auto lots = opened ? opened->find({.kind = EntryKind::lot}) : Result<std::vector<Entry>>(failure(opened));
    const auto wanted = static_cast<std::size_t>(units_);
    if (!entries || entries->size() != wanted || serials.size() != wanted || !lots || lots->size() != 1) {
      tally_.trouble = "a run that ended did not leave every unit once and one decision";
    }
    told_.clear();
    ++tally_.finished;
  }

  TemporaryFolder folder_;
  int units_;
  Random random_;
  InspectionKills tally_;
  std::map<std::int64_t, std::pair<std::string, std::string>> told_;
};

}  // namespace

InspectionKills kill_inspections(int units, int kills, std::uint64_t seed) { return KilledLot(units, seed).kill(kills); }

}  // namespace coilassay::test

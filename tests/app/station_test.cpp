// A station from its lines to its ledger, against a stand-in instrument that the test puts parts into.
#include "app/runs/station_run.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <deque>
#include <functional>
#include <string>
#include <vector>

#include "acquire/synthetic/stand_in.h"
#include "app/runs/station_bench.h"
#include "tests/support/instrument_bench.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::ElementsAre;
using testing::HasSubstr;
using testing::IsEmpty;
using Kind = StationNotice::Kind;

const char* const kSheet =
    "[part]\nname = \"drum-47\"\nrevision = \"C\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"45 uH\"\nmax = \"49 uH\"\ntest = \"reading\"\n"
    "at = { frequency = \"100 kHz\", level = \"1 V\" }\n";

/// An operator: what is done before each line is typed, and the line. With an empty line nothing is typed.
struct Turn {
  std::string line;
  std::function<void()> before = {};
};

class Operator final : public LineSource {
 public:
  explicit Operator(std::vector<Turn> turns, bool cut = false) : turns_(turns.begin(), turns.end()), cut_(cut) {}
  Came next(std::string& line, std::chrono::milliseconds) override {
    if (turns_.empty()) return Came::ended;
    const Turn turn = turns_.front();
    turns_.pop_front();
    if (turn.before) turn.before();
    line = turn.line;
    if (cut_ && turns_.empty()) return Came::cut_end;
    return line.empty() ? Came::nothing : Came::line;
  }

 private:
  std::deque<Turn> turns_;
  bool cut_;
};

/// Writes down what is shown, and looks into the ledger at that very moment.
struct Watcher final : StationView {
  explicit Watcher(std::string ledger_path) : ledger(std::move(ledger_path)) {}
  void begun(const StationProgress&) override {}
  void unit(const StationUnit& unit, const StationProgress& now) override {
    shown_verdicts.push_back(unit.attempt.serial + " " + std::string(name(unit.standing.verdict)));
    values.push_back(unit.attempt.limits.front().value.value_or(std::nan("")));
    slowest_s = std::max(slowest_s, unit.seconds);
    const auto open = Ledger::open({.path = ledger});
    ASSERT_TRUE(open);
    const auto entries = open->units(unit.attempt.serial);
    ASSERT_TRUE(entries);
    const bool there = std::any_of(entries->begin(), entries->end(), [&](const Entry& e) { return e.id == unit.entry; });
    if (!there) ++shown_before_stored;
    progress = now;
    if (on_unit) on_unit();
  }
  void notice(const StationNotice& notice, const StationProgress&) override {
    notices.push_back(notice);
    if (notice.kind != Kind::told) kinds.push_back(notice.kind);
  }
  std::string ledger;
  std::vector<std::string> shown_verdicts;
  std::vector<double> values;
  std::vector<StationNotice> notices;
  std::vector<Kind> kinds;
  int shown_before_stored = 0;
  double slowest_s = 0;
  StationProgress progress;
  std::function<void()> on_unit;
};

/// A station with one stand-in.
struct Fixture {
  explicit Fixture(const std::string& sheet_text = kSheet, const std::string& profile_more = "", synthetic::Misbehaviour wrong = {})
      : profile_text(meter_profile_text("localhost:1") + profile_more) {
    synthetic::StandInSetup setup;
    setup.profile = parsed_profile(profile_text);
    setup.misbehaviour = wrong;
    served.emplace(setup);
    sheet = folder.file("part.toml", sheet_text);
    profile = folder.file("meter.toml", meter_profile_text(served->address()) + profile_more);
  }
  std::function<void()> part(double l_h, double r_ohm = 0.35) {
    return [this, l_h, r_ohm] { served->stand_in().put_in({l_h, r_ohm, 0}); };
  }
  Result<StationEnd> run(std::vector<Turn> turns, const std::function<void(StationJob&)>& change = {}) {
    Operator typed(std::move(turns), cut_end);
    StationJob job;
    job.sheet = sheet;
    job.profiles = {profile};
    job.ledger = folder / "d.ledger";
    job.lot = "7";
    job.input = &typed;
    job.view = &watcher;
    job.clock = [this] { return now; };
    if (change) change(job);
    RunContext context;
    context.now = now;
    return run_station(job, context);
  }
  std::string profile_text;
  TemporaryFolder folder;
  std::optional<ServedStandIn> served;
  std::string sheet, profile;
  Watcher watcher{folder / "d.ledger"};
  UtcTime now = *parse_utc_time("2026-03-04T10:22:00Z");
  bool cut_end = false;
};

TEST(Station, JudgesStoresAndThenShows) {
  Fixture f;
  const auto end = f.run({{"0001", f.part(47e-6)}, {"0002", f.part(50e-6)}, {"0003", f.part(44.95e-6)}});
  ASSERT_TRUE(end) << end.error().finding;
  EXPECT_FALSE(end->broke);
  EXPECT_THAT(f.watcher.shown_verdicts, ElementsAre("0001 pass", "0002 fail", "0003 undecided"));
  EXPECT_EQ(f.watcher.shown_before_stored, 0);
  EXPECT_EQ(end->record.units.size(), 3u);
  EXPECT_EQ(end->record.decision.decision, LotResult::reject);
  EXPECT_EQ(f.watcher.progress.first_pass, 1u);
  EXPECT_LT(f.watcher.slowest_s, 1.0) << "from scan to verdict, an instrument that answers at once";
  const auto ledger = Ledger::open({.path = f.folder / "d.ledger"});
  ASSERT_TRUE(ledger);
  const auto entries = ledger->units_of_lot("7");
  ASSERT_EQ(entries->size(), 3u);
  EXPECT_THAT(entries->front().content.instrument, HasSubstr("bench-lcr"));
  EXPECT_TRUE(ledger->verify()->holds());
}

TEST(Station, DuplicatesStopAndRetestsGoByPolicy) {
  Fixture f(std::string(kSheet) + "[retest]\nattempts = 2\nreasons = [\"reseated\", \"contacts cleaned\"]\n");
  const auto end = f.run({{":again 1"}, {"1", f.part(50e-6)}, {"2", f.part(47e-6)}, {"1", f.part(47e-6)}, {":again"}, {":again 3"}, {":again 2"}, {":again 1"}});
  ASSERT_TRUE(end);
  EXPECT_THAT(f.watcher.shown_verdicts, ElementsAre("1 fail", "2 pass", "1 fail")) << "the first attempt stands";
  EXPECT_THAT(f.watcher.kinds, ElementsAre(Kind::refused, Kind::duplicate, Kind::refused, Kind::refused, Kind::refused));
  EXPECT_THAT(f.watcher.notices.back().words, HasSubstr("the sheet allows no more"));
  const auto ledger = Ledger::open({.path = f.folder / "d.ledger"});
  const auto attempts = ledger->units("1");
  ASSERT_EQ(attempts->size(), 2u);
  EXPECT_EQ((*attempts)[1].content.reason, "contacts cleaned");
  EXPECT_EQ(end->record.units[0].made, 2u);
  EXPECT_EQ(f.watcher.progress.units, 2u);
}

TEST(Station, TheMeanOfRepeatsAndOfAttemptsIsJudgedWhereTheSheetSaysSo) {
  Fixture f(std::string(kSheet) + "[test.reading]\nrepeats = 3\n[retest]\nattempts = 2\nuse = \"mean\"\n");
  const auto end = f.run({{"1", f.part(44.6e-6)}, {":again reseated", f.part(46.6e-6)}});
  ASSERT_TRUE(end) << end.error().finding;
  EXPECT_THAT(f.watcher.shown_verdicts, ElementsAre("1 fail", "1 undecided")) << "45.6 uH, but the two lie far apart";
}

TEST(Station, AUnitSetAsideCountsAsUndecidedAlsoAfterARestart) {
  Fixture f;
  ASSERT_TRUE(f.run({{":aside"}, {"1", f.part(47e-6)}, {":aside"}}));
  EXPECT_THAT(f.watcher.kinds, ElementsAre(Kind::refused, Kind::set_aside));
  const auto again = f.run({});
  ASSERT_TRUE(again);
  EXPECT_EQ(again->record.units.at(0).verdict.verdict, Verdict::undecided);
}

TEST(Station, NoPartIsNoFailAndAPoorContactIsNoPart) {
  Fixture f(std::string(kSheet) + "[test.reading]\nrepeats = 2\n",
            "[present]\nopen_above = { R_s = \"1 kohm\" }\nshort_below = { L_s = \"100 nH\" }\n[verdict]\npass = \"BIN 1\"\nfail = \"BIN 2\"\notherwise = \"BIN 3\"\n");
  const auto end = f.run({{"1", f.part(47e-6, 1e6)}, {"2", f.part(1e-9)}, {"1", f.part(47e-6)}, {"3", f.part(50e-6)}, {"4", f.part(44.95e-6)}});
  ASSERT_TRUE(end);
  EXPECT_THAT(f.watcher.kinds, ElementsAre(Kind::no_part, Kind::contact));
  EXPECT_THAT(f.watcher.shown_verdicts, ElementsAre("1 pass", "3 fail", "4 undecided"));
  EXPECT_EQ(end->record.units.size(), 3u);
  EXPECT_THAT(f.served->stand_in().commands_received(), ElementsAre("BIN 3", "BIN 1", "BIN 2", "BIN 3"))
      << "nothing to sort without a part; anything but a verdict goes to the third bin";
}

TEST(Station, TheInstrumentIsAskedWhetherAPartIsThere) {
  Fixture f(kSheet, "[present]\nask = \"PRES?\"\nwhen = \"1\"\n");
  const auto end = f.run({{"1", [&] { f.served->stand_in().set_present(false); }}, {"1", [&] { f.served->stand_in().set_present(true); }}});
  ASSERT_TRUE(end);
  EXPECT_THAT(f.watcher.kinds, ElementsAre(Kind::no_part));
  EXPECT_THAT(f.watcher.shown_verdicts, ElementsAre("1 pass"));
}

TEST(Station, TheSorterMovesOnlyAfterTheLedgerHasTheUnit) {
  Fixture f(kSheet, "[verdict]\npass = \"BIN 1\"\nfail = \"BIN 2\"\notherwise = \"BIN 3\"\n");
  std::size_t moved_before = 0;
  f.watcher.on_unit = [&] { moved_before += f.served->stand_in().commands_received().size(); };
  ASSERT_TRUE(f.run({{"1", f.part(47e-6)}}));
  EXPECT_EQ(moved_before, 0u);
  EXPECT_THAT(f.served->stand_in().commands_received(), ElementsAre("BIN 1"));
}

TEST(Station, PartsAreNumberedAsTheyArePutIn) {
  Fixture f(kSheet, "[present]\nask = \"PRES?\"\n");
  const auto in = [&] { f.served->stand_in().set_present(true); };
  const auto out = [&] { f.served->stand_in().set_present(false); };
  const auto end = f.run({{"", in}, {"", out}, {"", in}, {""}, {"", out}, {"9"}, {"", in}, {":quit"}}, [](StationJob& job) { job.count_serials = true; });
  ASSERT_TRUE(end) << end.error().finding;
  EXPECT_THAT(f.watcher.shown_verdicts, ElementsAre("1 pass", "2 pass")) << "what lay there at the start is not new";
  Fixture without;
  const auto refused = without.run({}, [](StationJob& job) { job.count_serials = true; });
  ASSERT_FALSE(refused);
  EXPECT_EQ(refused.error().problem, Problem::usage);
}

TEST(Station, AUnitBeyondTheLotsSizeIsRefusedAndTheLotKeepsItsSize) {
  Fixture f;
  const auto two = [](StationJob& job) { job.lot_size = 2; };
  const auto end = f.run({{"1", f.part(47e-6)}, {"2"}, {"3"}, {"1"}}, two);
  ASSERT_TRUE(end) << end.error().finding;
  EXPECT_THAT(f.watcher.shown_verdicts, ElementsAre("1 pass", "2 pass"));
  EXPECT_THAT(f.watcher.kinds, ElementsAre(Kind::refused, Kind::duplicate));
  ASSERT_EQ(f.watcher.notices.size(), 2u);
  EXPECT_EQ(f.watcher.notices[0].words, "the lot of 2 units is complete: this one is not measured. Is it of another lot, or was --lot-size too small?");
  EXPECT_EQ(end->record.lot_size, 2u);
  // Gone on with, and said to be smaller than what is there already.
  const auto smaller = f.run({}, [](StationJob& job) { job.lot_size = 1; });
  ASSERT_FALSE(smaller);
  EXPECT_EQ(smaller.error().place, "--lot-size");

  Fixture counted(kSheet, "[present]\nask = \"PRES?\"\n");
  const auto in = [&] { counted.served->stand_in().set_present(true); };
  const auto out = [&] { counted.served->stand_in().set_present(false); };
  ASSERT_TRUE(counted.run({{"", out}, {"", in}, {"", out}, {"", in}, {":quit"}}, [](StationJob& job) {
    job.count_serials = true;
    job.lot_size = 1;
  }));
  EXPECT_THAT(counted.watcher.shown_verdicts, ElementsAre("1 pass"));
  EXPECT_THAT(counted.watcher.kinds, ElementsAre(Kind::refused));
}

TEST(Station, NothingAnOperatorTypesHarmsIt) {
  Fixture f("[part]\nname = \"drum-47\"\nserial = \"[0-9]{4}\"\n" + std::string(kSheet).substr(std::string(kSheet).find("[[limit]]")));
  f.cut_end = true;
  const auto end = f.run({{"abc"}, {"\x1b[2J"}, {":dance"}, {":"}, {"  "}, {std::string(4096, '1') + '\0'}, {" 0001 ", f.part(47e-6)}, {"0002"}});
  ASSERT_TRUE(end) << end.error().finding;
  EXPECT_THAT(f.watcher.shown_verdicts, ElementsAre("0001 pass")) << "the last line was cut by the end of the input";
  EXPECT_EQ(f.watcher.kinds.size(), 6u);
  for (const StationNotice& notice : f.watcher.notices) {
    for (const char c : notice.serial + notice.words) EXPECT_GE(static_cast<unsigned char>(c), 0x20);
  }
}

TEST(Station, ACheckStandardBlocksUntilItIsMeasured) {
  Fixture f(std::string(kSheet) + "[check_standard]\nserial = \"CS-1\"\nquantity = \"L_s\"\nevery = \"8 h\"\ncentre = \"47 uH\"\nsigma = \"50 nH\"\n");
  const auto end = f.run({{"1", f.part(47e-6)}, {":check", f.part(48e-6)}, {"1", f.part(47e-6)}, {"CS-1"}, {"1"}, {"2", [&] { f.now += std::chrono::hours(9); }}});
  ASSERT_TRUE(end) << end.error().finding;
  EXPECT_THAT(f.watcher.kinds, ElementsAre(Kind::blocked, Kind::blocked, Kind::blocked, Kind::checked, Kind::blocked));
  EXPECT_THAT(f.watcher.shown_verdicts, ElementsAre("1 pass"));
  EXPECT_THAT(f.watcher.notices.back().words, HasSubstr("due every"));
  EXPECT_EQ(Ledger::open({.path = f.folder / "d.ledger"})->checks("CS-1")->size(), 2u);
}

TEST(Station, AnOverdueCalibrationBlocksUnlessTheProfileOnlyMarksIt) {
  Fixture f(kSheet, "[calibration]\nid = \"LCR-2\"\ndue = 2026-01-01\n");
  ASSERT_TRUE(f.run({{"1"}}));
  EXPECT_THAT(f.watcher.kinds, ElementsAre(Kind::blocked));
  Fixture marked(kSheet, "[calibration]\nid = \"LCR-2\"\ndue = 2026-01-01\noverdue = \"mark\"\n");
  const auto end = marked.run({{"1"}});
  ASSERT_TRUE(end);
  EXPECT_THAT(marked.watcher.shown_verdicts, ElementsAre("1 pass"));
  EXPECT_EQ(end->record.findings.at(0).code, "calibration_overdue");
}

// The claim the station stands on: an instrument of which a fifth of all replies go wrong, every unit with a value of its own.
TEST(Station, NoReadingLandsOnAWrongUnit) {
  synthetic::Misbehaviour wrong;
  wrong.late = wrong.split = wrong.garbled = wrong.doubled = wrong.silent = wrong.slow = wrong.gone = 0.2 / 7;
  Fixture f("[part]\nname = \"many\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"1 uH\"\nmax = \"1 mH\"\n", "", wrong);
  std::vector<Turn> turns;
  std::vector<double> truth;
  for (int i = 0; i < 60; ++i) {
    truth.push_back(47e-6 * (1 + 0.01 * i));
    turns.push_back({std::to_string(i), f.part(truth.back())});
  }
  const auto end = f.run(std::move(turns));
  ASSERT_TRUE(end) << end.error().finding;
  ASSERT_FALSE(end->broke) << end->broke->finding;
  ASSERT_EQ(f.watcher.values.size(), truth.size());
  for (std::size_t i = 0; i < truth.size(); ++i) EXPECT_NEAR(f.watcher.values[i] / truth[i], 1, 1e-4) << i;
  EXPECT_GT(f.served->stand_in().misbehaved(), 5u);
}

TEST(Station, AnInstrumentThatIsGoneForGoodKeepsWhatWasRecorded) {
  Fixture f;
  const auto end = f.run({{"1", f.part(47e-6)}, {"2", [&] { f.served.reset(); }}});
  ASSERT_TRUE(end) << end.error().finding;
  ASSERT_TRUE(end->broke);
  EXPECT_EQ(end->broke->problem, Problem::instrument);
  const auto ledger = Ledger::open({.path = f.folder / "d.ledger"});
  EXPECT_EQ(ledger->units_of_lot("7")->size(), 1u);
  EXPECT_EQ(end->head.hash, ledger->head()->hash);
  EXPECT_THAT(ledger->find({.kind = EntryKind::lot}).value(), IsEmpty()) << "nothing is decided";
}

TEST(Station, ARestartWithTheSameLotResumes) {
  Fixture f;
  ASSERT_TRUE(f.run({{"1", f.part(47e-6)}, {"2", f.part(50e-6)}}));
  const auto end = f.run({{"2"}, {"3", f.part(47e-6)}}, [](StationJob& job) { job.lot_size = 5; });
  ASSERT_TRUE(end);
  EXPECT_THAT(f.watcher.kinds, ElementsAre(Kind::duplicate));
  EXPECT_EQ(end->record.units.size(), 3u);
  EXPECT_TRUE(end->record.units[0].from_ledger);
  EXPECT_EQ(end->record.decision.decision, LotResult::undecided) << "three of five, all are to be measured";
  EXPECT_EQ(f.watcher.progress.n, 5u);
}

TEST(Station, ALimitIsServedByTheFirstProfileThatYieldsItAtItsConditions) {
  const auto sheet = parse_part_sheet(std::string(kSheet) + "[[limit]]\nquantity = \"R_s\"\nmax = \"1 ohm\"\n", "part.toml");
  ASSERT_TRUE(sheet) << sheet.error().finding;
  const auto run_of = [](double l, double r, double hz) {
    Measurement m;
    m.test = "reading";
    m.conditions.frequency_hz = hz;
    m.conditions.level_v = 1;
    for (const auto& [symbol, value, unit] : {std::tuple{"L_s", l, Unit::henry}, {"R_s", r, Unit::ohm}}) {
      Estimate e;
      e.symbol = symbol;
      e.quantity = {value, value * 1e-3, unit};
      e.low = value * (1 - 2e-3);
      e.high = value * (1 + 2e-3);
      e.k = 2;
      m.estimates.push_back(e);
    }
    return TestRun{"reading", "reading", std::nullopt, "", m};
  };
  // The first meter works at 1 kHz: its L_s does not count for the limit at 100 kHz, its R_s does for one without conditions.
  const auto all = served_once(*sheet, {{run_of(40e-6, 0.3, 1e3)}, {run_of(47e-6, 0.4, 1e5)}});
  std::vector<TestedUnit> tested;
  for (const TestRun& run : all) tested.push_back({run.test, run.measurement});
  const UnitVerdict unit = judge_unit(*sheet, "1", 1, tested);
  EXPECT_DOUBLE_EQ(*unit.limits[0].value, 47e-6);
  EXPECT_DOUBLE_EQ(*unit.limits[1].value, 0.3);
  EXPECT_EQ(unit.verdict, Verdict::pass);
}

}  // namespace
}  // namespace coilassay::test

// A recorded unit measured again from its raw files.
#include "app/runs/measure_again.h"

#include <gmock/gmock.h>

#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>

#include "app/runs/inspect_run.h"
#include "app/runs/simulate_run.h"
#include "ledger/ledger.h"
#include "tests/app/fake_console.h"
#include "tests/report/schema_check.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;
using testing::IsEmpty;
using testing::SizeIs;
namespace fs = std::filesystem;

/// A lot of three coils by ring-down, inspected into a ledger.
class Again : public testing::Test {
 protected:
  void SetUp() override {
    fs::create_directory(lot_);
    for (const char* serial : {"0001", "0002", "0003"}) {
      SimulateRingDownJob job;
      job.capture_file = std::string(serial) + ".ringdown.csv";
      job.bench.noise_v = 2e-3;
      job.bench.samples = 3000;
      job.bench.seed = static_cast<std::uint64_t>(serial[3]);
      RunContext context;
      context.write = [this](const std::string& name, const std::string& contents) -> Result<void> {
        std::ofstream(lot_ + "/" + name, std::ios::binary) << contents;
        return {};
      };
      ASSERT_TRUE(run_simulate_ring_down(job, context));
    }
    folder_.file("bench.toml", "[[capacitor]]\nvalue = \"10 nF ± 1 %\"\n");
    sheet_ = folder_.file("part.toml", "[part]\nname = \"drum-47\"\nrevision = \"C\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"37.6 uH\"\n"
                                       "max = \"56.4 uH\"\n[test.ringdown]\nbench = \"bench.toml\"\n");
    InspectJob job;
    job.sheet = sheet_;
    job.folder = lot_;
    job.ledger = ledger_;
    job.lot = "0412";
    RunContext context;
    context.now = *parse_utc_time("2026-03-04T10:22:00Z");
    const auto record = run_inspect(job, context, {});
    ASSERT_TRUE(record) << record.error().place << record.error().finding;
  }
  Entry first() const { return Ledger::open({.path = ledger_})->entry(1).value(); }
  static RunContext later() {
    RunContext context;
    context.now = *parse_utc_time("2027-05-06T07:08:09Z");
    return context;
  }
  const TemporaryFolder folder_;
  const std::string lot_ = folder_ / "lot", ledger_ = folder_ / "a.ledger";
  std::string sheet_;
};

TEST_F(Again, GivesEveryDigitAsItWas) {
  const auto again = measure_again(first().content, {}, later());
  ASSERT_TRUE(again) << again.error().finding;
  EXPECT_EQ(again->files, 1u);
  for (const auto& difference : again->differences) ADD_FAILURE() << difference.where << ": " << difference.recorded << ", " << difference.now;
}

TEST_F(Again, SeesADigitThatDiffers) {
  EntryContent entry = first().content;
  const std::size_t at = entry.details.find("\"value\":") + 8;
  const std::size_t end = entry.details.find_first_of(",}", at);
  const double value = std::stod(entry.details.substr(at, end - at));
  entry.details.replace(at, end - at, std::to_string(std::nextafter(value, 1)));  // fewer digits, hence another number
  entry.verdict = "fail";
  const auto again = measure_again(entry, {}, later());
  ASSERT_TRUE(again) << again.error().finding;
  ASSERT_THAT(again->differences, SizeIs(2));
  EXPECT_EQ(again->differences[0].where, "verdict");
  EXPECT_EQ(again->differences[0].recorded, "\"fail\"");
  EXPECT_EQ(again->differences[0].now, "\"pass\"");
  EXPECT_THAT(again->differences[1].where, HasSubstr("value"));
}

TEST_F(Again, GoesWhereTheFilesWentTo) {
  const std::string archive = folder_ / "archive";
  fs::create_directory(archive);
  fs::rename(lot_, archive + "/0412");
  fs::rename(sheet_, archive + "/part.toml");
  fs::copy(folder_ / "bench.toml", archive + "/bench.toml");
  EXPECT_FALSE(measure_again(first().content, {}, later()));
  const auto again = measure_again(first().content, {archive + "/part.toml", archive + "/0412"}, later());
  ASSERT_TRUE(again) << again.error().finding;
  for (const auto& difference : again->differences) {
    EXPECT_EQ(difference.where, "tests[0].bench.file") << difference.recorded << " " << difference.now;
  }
}

TEST_F(Again, RefusesAnotherCaptureOrSheetThanThatOfThen) {
  std::ofstream(lot_ + "/0001.ringdown.csv", std::ios::app) << "\n";
  EXPECT_THAT(measure_again(first().content, {}, later()).error().finding, HasSubstr("not the capture of then"));
  std::ofstream(sheet_, std::ios::app) << "\n# changed\n";
  EXPECT_THAT(measure_again(first().content, {}, later()).error().finding, HasSubstr("not the part sheet of then"));
}

TEST_F(Again, TellsOfABenchSheetThatWasChanged) {
  folder_.file("bench.toml", "[[capacitor]]\nvalue = \"10.1 nF ± 1 %\"\n");
  const auto again = measure_again(first().content, {}, later());
  ASSERT_TRUE(again) << again.error().finding;
  bool bench = false, value = false;
  for (const auto& difference : again->differences) {
    bench = bench || difference.where == "tests[0].bench.sha256";
    value = value || difference.where == "limits[0].value";
  }
  EXPECT_TRUE(bench);
  EXPECT_TRUE(value);
}

TEST_F(Again, IsNothingForADecisionOnALot) {
  const Entry last = Ledger::open({.path = ledger_})->find({.kind = EntryKind::lot}).value().back();
  EXPECT_THAT(measure_again(last.content, {}, later()).error().finding, HasSubstr("'lot' is not measured"));
}

TEST_F(Again, IsOneOptionOfShow) {
  const Ended same = run({"ledger", "show", ledger_, "2", "--again"});
  EXPECT_EQ(same.code, 0) << same.error;
  EXPECT_THAT(same.out, HasSubstr("every digit is the same"));
  const Ended json = run({"ledger", "show", ledger_, "2", "--again", "--json"});
  EXPECT_EQ(schema_trouble(json.out, "ledger"), "");
  EXPECT_EQ(nlohmann::json::parse(json.out).at("again").at("same"), true);

  folder_.file("bench.toml", "[[capacitor]]\nvalue = \"10.1 nF ± 1 %\"\n");
  const Ended other = run({"ledger", "show", ledger_, "2", "--again"});
  EXPECT_EQ(other.code, 1) << other.error;
  EXPECT_THAT(other.out, HasSubstr("it comes out otherwise"));
  EXPECT_EQ(run({"ledger", "show", ledger_, "2", "--folder", lot_}).code, 2);
}

}  // namespace
}  // namespace coilassay::test

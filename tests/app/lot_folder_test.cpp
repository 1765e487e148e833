// Which captures of a folder belong to which unit.
#include "app/runs/lot_folder.h"

#include <gmock/gmock.h>

#include <array>
#include <filesystem>

#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::ElementsAre;
using testing::HasSubstr;
using testing::IsEmpty;

constexpr std::array<std::string_view, 5> kTests{"coupling", "ramp", "resistance", "ringdown", "sweep"};

std::vector<std::string> serials(const LotFolder& lot) {
  std::vector<std::string> all;
  for (const LotUnit& unit : lot.units) all.push_back(unit.serial);
  return all;
}

LotFolder read(const TemporaryFolder& folder) {
  auto lot = read_lot_folder(folder.path(), kTests);
  EXPECT_TRUE(lot) << (lot ? "" : lot.error().finding);
  return lot ? std::move(*lot) : LotFolder{};
}

std::string base(const std::string& path) {
  return std::filesystem::path(path).filename().string();
}

TEST(LotFolderNames, GiveSerialTestAndOrder) {
  const TemporaryFolder folder;
  for (const char* name : {"0017.ramp.csv", "0017.ringdown.csv.gz", "9.sweep.s1p", "10.sweep.s1p", "A.2.ramp.csv",
                           "12.ringdown.2.csv", "12.ringdown.10.csv", "12.ringdown.1.csv"}) {
    folder.file(name, name);
  }
  const LotFolder lot = read(folder);
  EXPECT_THAT(serials(lot), ElementsAre("9", "10", "12", "0017", "A.2"));
  EXPECT_THAT(lot.strays, IsEmpty());
  ASSERT_NE(lot.units[3].find("ramp"), nullptr);
  ASSERT_NE(lot.units[3].find("ringdown"), nullptr);
  EXPECT_EQ(lot.units[3].find("sweep"), nullptr);
  std::vector<std::string> order;
  for (const std::string& file : lot.units[2].find("ringdown")->files) order.push_back(base(file));
  EXPECT_THAT(order, ElementsAre("12.ringdown.1.csv", "12.ringdown.2.csv", "12.ringdown.10.csv"))
      << "numbers count as numbers";
  EXPECT_EQ(lot.name, base(folder.path()));
}

TEST(LotFolderNames, StraysAreNamedAndNothingElse) {
  const TemporaryFolder folder;
  for (const char* name : {"1.ramp.csv", "2.rmap.csv", "notes.txt", ".hidden", "bench.toml", "1.truth.json"}) {
    folder.file(name, name);
  }
  std::filesystem::create_directory(folder / "old.ramp.csv");
  const LotFolder lot = read(folder);
  EXPECT_THAT(serials(lot), ElementsAre("1"));
  EXPECT_THAT(lot.strays, ElementsAre("2.rmap.csv", "notes.txt"));
  ASSERT_EQ(lot.findings.size(), 1u);
  EXPECT_EQ(lot.findings[0].code, "stray_file");
  EXPECT_THAT(lot.findings[0].message, HasSubstr("'2.rmap.csv' (ramp?)"));
}

TEST(LotFolderNames, TwoCapturesForOnePlaceAreNotChosenFrom) {
  const TemporaryFolder folder;
  folder.file("1.ramp.csv", "a");
  folder.file("1.ramp.txt", "b");
  folder.file("2.ramp.csv", "c");
  const LotFolder lot = read(folder);
  ASSERT_TRUE(lot.units[0].find("ramp")->trouble);
  EXPECT_THAT(lot.units[0].find("ramp")->trouble->finding, HasSubstr("second capture"));
  EXPECT_FALSE(lot.units[1].find("ramp")->trouble);
}

TEST(LotFolderNames, SayWhichMeasurementOfTwoWindingsACaptureIs) {
  const TemporaryFolder folder;
  for (const char* name : {"T-1.coupling.primary_open.csv", "T-1.coupling.primary_short.csv", "T-1.coupling.ratio_forward.csv.gz"}) {
    folder.file(name, name);
  }
  const LotFolder lot = read(folder);
  ASSERT_EQ(serials(lot), std::vector<std::string>{"T-1"});
  ASSERT_NE(lot.units[0].find("coupling"), nullptr);
  EXPECT_EQ(lot.units[0].find("coupling")->files.size(), 3u);
  EXPECT_FALSE(lot.units[0].find("coupling")->trouble);
}

TEST(LotFolderNames, AFolderWithoutUnitsIsRefused) {
  const TemporaryFolder folder;
  EXPECT_THAT(read_lot_folder(folder.path(), kTests).error().finding, HasSubstr("no unit"));
  EXPECT_EQ(read_lot_folder(folder / "missing", kTests).error().problem, Problem::unreadable);
}

TEST(LotFolderNames, SerialsThatDifferOnlyInCapitalsAreSuspicious) {
  const TemporaryFolder folder;
  folder.file("a7.ramp.csv", "1");
  folder.file("A7.ramp.csv", "2");
  const LotFolder lot = read(folder);
  ASSERT_EQ(lot.findings.size(), 1u);
  EXPECT_EQ(lot.findings[0].code, "duplicate_serial");
}

TEST(SerialOrder, CountsNumbersAsNumbers) {
  EXPECT_TRUE(serial_before("9", "10"));
  EXPECT_TRUE(serial_before("B9", "B10"));
  EXPECT_FALSE(serial_before("B10", "B9"));
  EXPECT_TRUE(serial_before("A10", "B9"));
  EXPECT_TRUE(serial_before("A", "A1"));
  EXPECT_NE(serial_before("7", "07"), serial_before("07", "7")) << "every two serials have an order";
  EXPECT_FALSE(serial_before("7", "7"));
}

TEST(LotList, ListsUnitsWithPathsRelativeToIt) {
  const TemporaryFolder folder;
  folder.file("one.csv", "1");
  folder.file("two.csv", "2");
  folder.file("lot.toml",
              "lot = \"0412\"\n[[unit]]\nserial = \"B\"\nramp = \"one.csv\"\nreason = \"reseated\"\n"
              "[[unit]]\nserial = \"A\"\nringdown = [\"two.csv\", \"one.csv\"]\n");
  const LotFolder lot = read(folder);
  EXPECT_EQ(lot.name, "0412");
  EXPECT_THAT(serials(lot), ElementsAre("B", "A")) << "in the order of the list";
  EXPECT_EQ(lot.units[0].reason, "reseated");
  EXPECT_THAT(lot.units[1].find("ringdown")->files, ElementsAre(folder / "two.csv", folder / "one.csv"));
}

TEST(LotList, RefusesWhatIsNotThereOrTwice) {
  const TemporaryFolder folder;
  folder.file("one.csv", "1");
  const auto error_of = [&](const std::string& list) {
    return read_lot_folder(folder.file("lot.toml", list), kTests).error();
  };
  const Error twice = error_of("[[unit]]\nserial = \"A\"\nramp = \"one.csv\"\n[[unit]]\nserial = \"A\"\n");
  EXPECT_THAT(twice.finding, HasSubstr("twice"));
  EXPECT_THAT(twice.place, HasSubstr("lot.toml:5"));
  EXPECT_THAT(error_of("[[unit]]\nserial = \"A\"\nramp = \"gone.csv\"\n").finding, HasSubstr("gone.csv"));
  EXPECT_THAT(error_of("[[unit]]\nserial = \"A\"\nrmap = \"one.csv\"\n").remedy, HasSubstr("ramp"));
  EXPECT_THAT(error_of("[[unit]]\nramp = \"one.csv\"\n").finding, HasSubstr("no serial"));
}

TEST(SameCaptures, UnderTwoSerialsJudgeNeither) {
  const TemporaryFolder folder;
  folder.file("1.ramp.csv", "the same bytes");
  folder.file("2.ramp.csv", "the same bytes");
  folder.file("3.ramp.csv", "the same sizes");
  folder.file("4.ramp.csv", "longer than all the others");
  LotFolder lot = read(folder);
  ASSERT_TRUE(find_same_captures(lot));
  ASSERT_TRUE(lot.units[0].find("ramp")->trouble);
  ASSERT_TRUE(lot.units[1].find("ramp")->trouble);
  EXPECT_THAT(lot.units[0].find("ramp")->trouble->finding, HasSubstr("2.ramp.csv"));
  EXPECT_FALSE(lot.units[2].find("ramp")->trouble);
  EXPECT_FALSE(lot.units[3].find("ramp")->trouble);
  ASSERT_EQ(lot.findings.size(), 1u);
  EXPECT_EQ(lot.findings[0].code, "duplicate_serial");
}

TEST(SameCaptures, AsTwoRepeatsOfOneUnitAreNoRepeats) {
  const TemporaryFolder folder;
  folder.file("1.ramp.1.csv", "the same bytes");
  folder.file("1.ramp.2.csv", "the same bytes");
  LotFolder lot = read(folder);
  ASSERT_TRUE(find_same_captures(lot));
  ASSERT_TRUE(lot.units[0].find("ramp")->trouble);
  EXPECT_THAT(lot.units[0].find("ramp")->trouble->finding, HasSubstr("twice"));
  EXPECT_THAT(lot.findings, IsEmpty()) << "no serial is in doubt";
}

}  // namespace
}  // namespace coilassay::test

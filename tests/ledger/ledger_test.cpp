// Adding to a ledger and asking it.
#include "ledger/ledger.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>
#include <sys/stat.h>

#include <filesystem>

#include "base/digest.h"
#include "tests/ledger/made_entries.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;
using testing::IsEmpty;
using testing::SizeIs;

EntryContent made_correction(const Entry& of, const std::string& reason) {
  EntryContent content = of.content;
  content.kind = EntryKind::correction;
  content.corrects = of.id;
  content.reason = reason;
  content.sources.clear();
  content.details.clear();
  return content;
}

TEST(Ledger, ANewOneIsEmptyAndHolds) {
  const TemporaryFolder folder;
  const auto ledger = Ledger::open({.path = folder / "a.ledger", .mode = LedgerMode::create});
  ASSERT_TRUE(ledger) << ledger.error().finding;
  EXPECT_EQ(ledger->head()->id, 0);
  EXPECT_EQ(ledger->head()->hash, kFirstPrevious);
  EXPECT_EQ(ledger->part().value(), "");
  const auto check = ledger->verify();
  ASSERT_TRUE(check);
  EXPECT_TRUE(check->holds()) << check->faults[0].what;
  EXPECT_EQ(check->entries, 0);
}

TEST(Ledger, IsReadableByOwnerAndGroupOnlyAndLeavesNothingBesideIt) {
  const TemporaryFolder folder;
  const mode_t before = ::umask(0);
  { const Ledger ledger = made_ledger(folder / "a.ledger", 3); }
  ::umask(before);
  struct stat about {};
  ASSERT_EQ(::stat((folder / "a.ledger").c_str(), &about), 0);
  EXPECT_EQ(about.st_mode & 0777, 0640u);
  std::vector<std::string> names;
  for (const auto& entry : std::filesystem::directory_iterator(folder.path())) names.push_back(entry.path().filename());
  EXPECT_THAT(names, testing::ElementsAre("a.ledger"));
}

TEST(Ledger, EachEntryFollowsTheOneBefore) {
  const TemporaryFolder folder;
  Ledger ledger = made_ledger(folder / "a.ledger", 60);
  const auto all = ledger.find({});
  ASSERT_TRUE(all);
  ASSERT_THAT(*all, SizeIs(60));
  std::string previous{kFirstPrevious};
  for (std::size_t i = 0; i < all->size(); ++i) {
    const Entry& entry = (*all)[i];
    EXPECT_EQ(entry.id, static_cast<std::int64_t>(i + 1));
    EXPECT_EQ(entry.previous, previous);
    EXPECT_EQ(entry.hash, sha256_of(previous + "\n" + entry.body));
    previous = entry.hash;
  }
  EXPECT_EQ(ledger.head()->hash, previous);
  EXPECT_TRUE(ledger.verify()->holds());
}

TEST(Ledger, GivesBackWhatWasAdded) {
  const TemporaryFolder folder;
  const std::string path = folder / "odd \"name\" = x'; .ledger";
  EntryContent content = made_unit("0'); DROP TABLE entry; --", "fail");
  content.lot = "ßöø €";
  Entry stored;
  {
    auto ledger = Ledger::open({.path = path, .mode = LedgerMode::create});
    ASSERT_TRUE(ledger) << ledger.error().finding;
    const auto added = ledger->append(content);
    ASSERT_TRUE(added) << added.error().finding;
    stored = *added;
  }
  const auto ledger = Ledger::open({.path = path});
  ASSERT_TRUE(ledger) << ledger.error().finding;
  const auto entry = ledger->entry(1);
  ASSERT_TRUE(entry);
  EXPECT_EQ(entry->body, stored.body);
  EXPECT_EQ(entry->hash, stored.hash);
  EXPECT_EQ(entry->body, body_of(content).value());
  EXPECT_EQ(entry->content.serial, content.serial);
  EXPECT_EQ(entry->content.lot, content.lot);
  EXPECT_EQ(entry->content.sources, content.sources);
}

TEST(Ledger, FindsByWhatWasAsked) {
  const TemporaryFolder folder;
  Ledger ledger = made_ledger(folder / "a.ledger", 30);
  ASSERT_TRUE(ledger.append(made_lot("0412", "accept")));
  EXPECT_THAT(ledger.find({.serial = "0007"}).value(), SizeIs(1));
  EXPECT_THAT(ledger.find({.kind = EntryKind::lot}).value(), SizeIs(1));
  EXPECT_THAT(ledger.find({.lot = "0412"}).value(), SizeIs(31));
  EXPECT_THAT(ledger.find({.lot = "0413"}).value(), IsEmpty());
  EXPECT_THAT(ledger.find({.sha256 = sha256_of(std::string("ramp of 0012"))}).value(), SizeIs(1));
  EXPECT_THAT(ledger.find({.from = 10, .to = 12}).value(), SizeIs(3));
  const auto newest = ledger.find({.newest = 2}).value();
  ASSERT_THAT(newest, SizeIs(2));
  EXPECT_EQ(newest[0].id, 30);
  EXPECT_EQ(newest[1].id, 31);
  EXPECT_THAT(ledger.lots().value(), SizeIs(1));
  EXPECT_THAT(ledger.lots("Reel Hall").value(), SizeIs(1));
  EXPECT_THAT(ledger.lots("Other Hall").value(), IsEmpty());
  EXPECT_FALSE(ledger.entry(32));
}

TEST(Ledger, ACorrectionPointsBackAndTheNewestOneCounts) {
  const TemporaryFolder folder;
  Ledger ledger = made_ledger(folder / "a.ledger", 3);
  const Entry second = ledger.entry(2).value();
  EntryContent serial = made_correction(second, "typed wrong");
  serial.serial = "0202";
  ASSERT_TRUE(ledger.append(serial));
  EntryContent again = made_correction(second, "typed wrong, and withdrawn");
  again.serial = "0203";
  again.verdict = "undecided";
  ASSERT_TRUE(ledger.append(again));

  const Entry recorded = ledger.entry(2).value();
  EXPECT_EQ(recorded.content.serial, "0002") << "what was recorded stays";
  EXPECT_EQ(recorded.corrected_by, 5);
  EXPECT_THAT(ledger.corrections_of(2).value(), SizeIs(2));
  EXPECT_THAT(ledger.units("0002").value(), IsEmpty());
  EXPECT_THAT(ledger.units("0202").value(), IsEmpty());
  const auto stands = ledger.units("0203").value();
  ASSERT_THAT(stands, SizeIs(1));
  EXPECT_EQ(stands[0].id, 2);
  EXPECT_EQ(stands[0].content.verdict, "undecided");
  EXPECT_THAT(ledger.units_of_lot("0412").value(), SizeIs(3));
  EXPECT_TRUE(ledger.verify()->holds());

  // The serial is free again for the unit that really has it.
  EXPECT_TRUE(ledger.append(made_unit("0002")));
  EXPECT_FALSE(ledger.append(made_unit("0203")));
}

TEST(Ledger, ACorrectionOfACorrectionOrOfNothingIsRefused) {
  const TemporaryFolder folder;
  Ledger ledger = made_ledger(folder / "a.ledger", 1);
  const Entry first = ledger.entry(1).value();
  const auto correction = ledger.append(made_correction(first, "why"));
  ASSERT_TRUE(correction);
  EXPECT_THAT(ledger.append(made_correction(*correction, "why")).error().finding, HasSubstr("is a correction itself"));
  Entry nothing = first;
  nothing.id = 99;
  EXPECT_THAT(ledger.append(made_correction(nothing, "why")).error().finding, HasSubstr("no entry 99"));
  EXPECT_EQ(ledger.head()->id, 2);
}

TEST(Ledger, TheSameAttemptIsNotStoredTwiceAndNothingOfItsBatchIs) {
  const TemporaryFolder folder;
  Ledger ledger = made_ledger(folder / "a.ledger", 2);
  const std::vector<EntryContent> batch{made_unit("0003"), made_unit("0002")};
  const auto stored = ledger.append(batch);
  ASSERT_FALSE(stored);
  EXPECT_THAT(stored.error().finding, HasSubstr("entry 2 is attempt 1 at unit '0002' already"));
  EXPECT_EQ(ledger.head()->id, 2);
  EntryContent again = made_unit("0002");
  again.attempt = 2;
  again.reason = "contact was dirty";
  EXPECT_TRUE(ledger.append(again)) << "the object goes on working";
  EntryContent revised = made_unit("0002");
  revised.revision = "D";
  EXPECT_TRUE(ledger.append(revised)) << "another revision of the sheet judges anew";
}

TEST(Ledger, HoldsOnePart) {
  const TemporaryFolder folder;
  Ledger ledger = made_ledger(folder / "a.ledger", 1);
  EntryContent other = made_unit("0002");
  other.part = "bobbin-9";
  EXPECT_THAT(ledger.append(other).error().finding, HasSubstr("ledger of part 'drum-47', not of 'bobbin-9'"));
  const auto wrong = Ledger::open({.path = folder / "a.ledger", .part = "bobbin-9"});
  ASSERT_FALSE(wrong);
  EXPECT_EQ(wrong.error().problem, Problem::ledger);
  EXPECT_TRUE(Ledger::open({.path = folder / "a.ledger", .part = "drum-47"}));
}

TEST(Ledger, AnEmptyFileBecomesOneOnlyForAdding) {
  const TemporaryFolder folder;
  const std::string path = folder.file("a.ledger", "");
  EXPECT_THAT(Ledger::open({.path = path}).error().finding, HasSubstr("it is empty"));
  EXPECT_THAT(Ledger::open({.path = path, .mode = LedgerMode::append}).error().finding, HasSubstr("it is empty"));
  ASSERT_TRUE(Ledger::open({.path = path, .mode = LedgerMode::create}));
  EXPECT_TRUE(Ledger::open({.path = path})->verify()->holds());
}

TEST(Ledger, WhatIsReadOnlyAddsNothing) {
  const TemporaryFolder folder;
  { const Ledger ledger = made_ledger(folder / "a.ledger", 1); }
  auto ledger = Ledger::open({.path = folder / "a.ledger"});
  ASSERT_TRUE(ledger);
  EXPECT_FALSE(ledger->append(made_unit("0002")));
  EXPECT_EQ(ledger->head()->id, 1);
}

}  // namespace
}  // namespace coilassay::test

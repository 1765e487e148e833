// Somebody who may write the file changes it, with or without traces: verify finds it.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "base/digest.h"
#include "ledger/schema.h"
#include "tests/ledger/flipped_bytes.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;
using testing::IsEmpty;

class Tampering : public testing::Test {
 protected:
  void SetUp() override {
    Ledger ledger = made_ledger(path_, 5);
    EntryContent correction = ledger.entry(2)->content;
    correction.kind = EntryKind::correction;
    correction.corrects = 2;
    correction.reason = "typed wrong";
    ASSERT_TRUE(ledger.append(correction));
  }
  /// Takes the rules away, does it, and puts them back as they were.
  void change(const std::string& sql) const {
    std::string script = "PRAGMA foreign_keys = OFF; ", back;
    for (const SchemaItem& item : ledger_schema()) {
      if (item.kind != "trigger") continue;
      script += "DROP TRIGGER " + std::string(item.name) + "; ";
      back += std::string(item.sql) + "; ";
    }
    const ShellEnd end = sqlite_shell(path_, script + sql + "; " + back);
    ASSERT_EQ(end.exit_code, 0) << sql << end.text;
  }
  /// All faults, one line each, "2: what"; "holds" when there are none.
  std::string verified() const {
    const auto ledger = Ledger::open({.path = path_});
    if (!ledger) return "not opened: " + ledger.error().finding;
    const auto check = ledger->verify();
    if (!check) return "not checked: " + check.error().finding;
    std::string all;
    for (const LedgerFault& fault : check->faults) all += std::to_string(fault.id) + ": " + fault.what + "\n";
    return all.empty() ? "holds" : all;
  }
  const TemporaryFolder folder_;
  const std::string path_ = folder_ / "a.ledger";
};

TEST_F(Tampering, NothingDoneHolds) {
  EXPECT_EQ(verified(), "holds");
  change("SELECT 1");
  EXPECT_EQ(verified(), "holds") << "the rules came back as they were";
}

TEST_F(Tampering, AChangedColumnIsNamed) {
  for (const char* column : {"time", "part", "revision", "supplier", "sheet_sha256", "lot", "serial", "verdict", "operator",
                             "instrument", "program", "reason"}) {
    TearDown();
    change("UPDATE entry SET " + std::string(column) + " = " + column + " || 'x' WHERE id = 3");
    EXPECT_THAT(verified(), HasSubstr("3: the column '" + std::string(column) + "' says")) << column;
    change("UPDATE entry SET " + std::string(column) + " = substr(" + column + ", 1, length(" + column + ") - 1) WHERE id = 3");
    EXPECT_EQ(verified(), "holds") << column;
  }
  change("UPDATE entry SET attempt = 2 WHERE id = 3");
  EXPECT_THAT(verified(), HasSubstr("3: the column 'attempt' says '2'"));
  change("UPDATE entry SET attempt = 1 WHERE id = 3; UPDATE entry SET kind = 'check' WHERE id = 3");
  EXPECT_THAT(verified(), HasSubstr("3: the column 'kind' says 'check'"));
  change("UPDATE entry SET kind = 'unit' WHERE id = 3; UPDATE entry SET corrects = 1 WHERE id = 6");
  EXPECT_THAT(verified(), HasSubstr("6: the column 'corrects' says '1'"));
}

TEST_F(Tampering, AChangedTextIsNoticedWithOrWithoutItsHash) {
  change("UPDATE entry SET body = replace(body, '\"pass\"', '\"fail\"'), verdict = 'fail' WHERE id = 3");
  EXPECT_THAT(verified(), HasSubstr("3: its text does not have the hash"));
  const std::string previous = sqlite_shell(path_, "SELECT previous FROM entry WHERE id = 3").text.substr(0, 64);
  const std::string body = sqlite_shell(path_, "SELECT body FROM entry WHERE id = 3").text;
  change("UPDATE entry SET hash = '" + sha256_of(previous + "\n" + body.substr(0, body.size() - 1)) + "' WHERE id = 3");
  EXPECT_THAT(verified(), testing::StartsWith("4: it does not follow the entry before it"));
}

TEST_F(Tampering, ChangedFilesAreNoticed) {
  change("UPDATE source SET sha256 = replace(sha256, 'a', 'b') WHERE entry = 4");
  EXPECT_EQ(verified(), "4: the list of its files was changed\n");
  change("DELETE FROM source WHERE entry = 4");
  EXPECT_EQ(verified(), "4: the list of its files was changed\n");
  change("INSERT INTO source VALUES(17, 0, 'ramp', 'x', 'y')");
  EXPECT_THAT(verified(), HasSubstr("files are listed for entry 17, which does not exist"));
}

TEST_F(Tampering, AMissingEntryIsNamed) {
  change("DELETE FROM source WHERE entry IN (3, 4); DELETE FROM entry WHERE id IN (3, 4)");
  EXPECT_THAT(verified(), HasSubstr("5: entries 3 to 4 are missing"));
}

TEST_F(Tampering, EntriesThatChangedPlacesAreNoticed) {
  change("UPDATE entry SET id = 99 WHERE id = 3; UPDATE entry SET id = 3 WHERE id = 4; UPDATE entry SET id = 4 WHERE id = 99");
  EXPECT_THAT(verified(), HasSubstr("3: it does not follow"));
}

TEST_F(Tampering, ACutTailShowsInTheHead) {
  const auto before = Ledger::open({.path = path_})->head();
  change("DELETE FROM source WHERE entry = 6; DELETE FROM entry WHERE id = 6");
  EXPECT_EQ(verified(), "holds") << "a chain cannot know what came after";
  EXPECT_NE(Ledger::open({.path = path_})->head()->hash, before->hash) << "the head in the report says more than the file";
}

TEST_F(Tampering, MissingAndForeignRulesAreNamed) {
  sqlite_shell(path_, "DROP TRIGGER entry_stays; DROP INDEX source_sha256; CREATE TABLE extra(a)");
  const std::string found = verified();
  EXPECT_THAT(found, HasSubstr("the trigger 'entry_stays' is missing"));
  EXPECT_THAT(found, HasSubstr("the index 'source_sha256' is missing"));
  EXPECT_THAT(found, HasSubstr("it holds something of its own: the table extra"));
}

TEST_F(Tampering, AFaultedEntryIsNotShownAsIfNothingWere) {
  change("UPDATE entry SET body = replace(body, '\"pass\"', '\"fail\"') WHERE id = 3");
  const auto entry = Ledger::open({.path = path_})->entry(3);
  ASSERT_FALSE(entry);
  EXPECT_THAT(entry.error().finding, HasSubstr("entry 3 is damaged or was altered"));
}

TEST_F(Tampering, ManyFaultsAreCountedNotListedWithoutEnd) {
  { const Ledger more = made_ledger(folder_ / "more.ledger", 100); }
  const TemporaryFolder other;
  Ledger ledger = made_ledger(other / "b.ledger", 100);
  sqlite_shell(other / "b.ledger", "DROP TRIGGER entry_keeps_what_it_says; UPDATE entry SET lot = 'x'");
  const auto check = ledger.verify();
  ASSERT_TRUE(check);
  EXPECT_EQ(check->faults.size(), kMostFaults);
  EXPECT_TRUE(check->more_faults);
  EXPECT_EQ(check->entries, 100);
}

TEST(TamperingBytes, AFlippedByteIsNoticedOrChangesNothing) {
  // Every byte: tests/proof/ledger_flips.cpp
  const TemporaryFolder folder;
  const FlipTally tally = flip_bytes(folder, 3, 13);
  EXPECT_GT(tally.noticed, 300u);
  EXPECT_THAT(tally.missed, IsEmpty());
  EXPECT_LT(tally.without_effect, tally.flips / 5);
}

}  // namespace
}  // namespace coilassay::test

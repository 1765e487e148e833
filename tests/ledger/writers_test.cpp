// Two stations add to one ledger at the same time.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <set>

#include "tests/ledger/in_child.h"
#include "tests/ledger/made_entries.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

/// Adds 40 units one after the other; how many were stored and how many were refused as there already.
std::string add_forty(const std::string& path, const std::string& prefix) {
  auto ledger = Ledger::open({.path = path, .mode = LedgerMode::create});
  if (!ledger) return "not opened: " + ledger.error().finding;
  int stored = 0, there = 0;
  for (int i = 0; i < 40; ++i) {
    const auto added = ledger->append(made_unit(prefix + std::to_string(i)));
    if (added) ++stored;
    else if (added.error().finding.find("already") != std::string::npos) ++there;
    else return added.error().finding;
  }
  return std::to_string(stored) + " " + std::to_string(there);
}

TEST(LedgerWriters, OfDifferentUnitsWaitForEachOtherAndBothAreStored) {
  const TemporaryFolder folder;
  const std::string path = folder / "a.ledger";
  const pid_t other = ::fork();  // makes the file, or finds it made
  if (other == 0) ::_exit(add_forty(path, "B") == "40 0" ? 0 : 1);
  EXPECT_EQ(in_child([&] { return add_forty(path, "A"); }), "40 0");
  int status = 0;
  ::waitpid(other, &status, 0);
  EXPECT_EQ(status, 0);
  const auto ledger = Ledger::open({.path = path});
  ASSERT_TRUE(ledger);
  EXPECT_TRUE(ledger->verify()->holds());
  std::set<std::string> serials;
  const std::vector<Entry> all = ledger->find({}).value();
  for (const Entry& entry : all) serials.insert(entry.content.serial);
  EXPECT_EQ(serials.size(), 80u);
}

TEST(LedgerWriters, OfTheSameUnitsStoreEachAttemptOnce) {
  const TemporaryFolder folder;
  const std::string path = folder / "a.ledger";
  const pid_t other = ::fork();
  if (other == 0) ::_exit(add_forty(path, "A").starts_with("not") ? 1 : 0);
  const std::string said = in_child([&] { return add_forty(path, "A"); });
  EXPECT_THAT(said, testing::MatchesRegex("[0-9]+ [0-9]+"));
  int status = 0;
  ::waitpid(other, &status, 0);
  EXPECT_EQ(status, 0);
  const auto ledger = Ledger::open({.path = path});
  ASSERT_TRUE(ledger);
  EXPECT_TRUE(ledger->verify()->holds());
  EXPECT_EQ(ledger->head()->id, 40);
}

TEST(LedgerWriters, InOneProcessDoNotTakeEachOthersLocksAway) {
  const TemporaryFolder folder;
  Ledger first = made_ledger(folder / "a.ledger", 1);
  for (int i = 0; i < 10; ++i) {
    auto second = Ledger::open({.path = folder / "a.ledger", .mode = LedgerMode::append});
    ASSERT_TRUE(second) << second.error().finding;
    ASSERT_TRUE(second->append(made_unit("S" + std::to_string(i))));
    ASSERT_TRUE(first.append(made_unit("F" + std::to_string(i))));
  }
  EXPECT_EQ(first.head()->id, 21);
  EXPECT_TRUE(first.verify()->holds());
}

}  // namespace
}  // namespace coilassay::test

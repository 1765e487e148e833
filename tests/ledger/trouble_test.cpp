// What the world does to a ledger ends in one sentence each, and leaves it as it was.
#include <gmock/gmock.h>
#include <gtest/gtest.h>
#include <sys/resource.h>
#include <sys/stat.h>

#include <filesystem>

#include "tests/ledger/in_child.h"
#include "tests/ledger/made_entries.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

std::string opening(const std::string& path, LedgerMode mode = LedgerMode::read_only) {
  const auto ledger = Ledger::open({.path = path, .mode = mode, .wait_s = 0});
  if (ledger) return "opened";
  EXPECT_EQ(ledger.error().problem, Problem::ledger);
  return ledger.error().finding + " (" + ledger.error().remedy + ")";
}

TEST(LedgerTrouble, WhatIsNoneIsCalledSo) {
  const TemporaryFolder folder;
  EXPECT_THAT(opening(folder / "none"), HasSubstr("no such ledger"));
  EXPECT_THAT(opening(folder / "no/such/folder", LedgerMode::create), HasSubstr("no such folder"));
  EXPECT_THAT(opening(folder.path()), HasSubstr("no file"));
  EXPECT_THAT(opening("", LedgerMode::create), HasSubstr("empty"));
  const std::string table = folder.file("table.csv", std::string(2000, '1'));
  EXPECT_THAT(opening(table), HasSubstr("this is no ledger"));
  EXPECT_THAT(opening(table, LedgerMode::create), HasSubstr("this is no ledger"));
  EXPECT_EQ(contents_of(table), std::string(2000, '1')) << "it was touched";
  EXPECT_THAT(opening(folder.file("short", "x")), HasSubstr("this is no ledger"));
  sqlite_shell(folder / "other.db", "CREATE TABLE t(a)");
  EXPECT_THAT(opening(folder / "other.db"), HasSubstr("no ledger of this program"));
  EXPECT_THAT(opening(folder / "other.db", LedgerMode::create), HasSubstr("no ledger of this program"));
}

TEST(LedgerTrouble, ANewerVersionIsLeftAlone) {
  const TemporaryFolder folder;
  { const Ledger ledger = made_ledger(folder / "a.ledger", 2); }
  ASSERT_EQ(sqlite_shell(folder / "a.ledger", "PRAGMA user_version = 2").exit_code, 0);
  for (const LedgerMode mode : {LedgerMode::read_only, LedgerMode::append, LedgerMode::create}) {
    EXPECT_THAT(opening(folder / "a.ledger", mode), HasSubstr("newer version"));
  }
}

TEST(LedgerTrouble, NothingIsAddedWhenTheRulesWereTouched) {
  const TemporaryFolder folder;
  { const Ledger ledger = made_ledger(folder / "a.ledger", 2); }
  ASSERT_EQ(sqlite_shell(folder / "a.ledger", "DROP TRIGGER entry_stays").exit_code, 0);
  EXPECT_THAT(opening(folder / "a.ledger", LedgerMode::append), HasSubstr("'entry_stays' is missing"));
  EXPECT_EQ(opening(folder / "a.ledger"), "opened") << "looking at it goes";
  ASSERT_EQ(sqlite_shell(folder / "a.ledger", "CREATE TRIGGER entry_stays AFTER INSERT ON entry BEGIN SELECT 1; END").exit_code, 0);
  EXPECT_THAT(opening(folder / "a.ledger", LedgerMode::append), HasSubstr("'entry_stays' was altered"));
}

TEST(LedgerTrouble, ALockedOneIsWaitedForAndThenRefused) {
  const TemporaryFolder folder;
  const std::string path = folder / "a.ledger";
  Ledger ledger = made_ledger(path, 1);
  auto impatient = Ledger::open({.path = path, .mode = LedgerMode::append, .wait_s = 0});
  ASSERT_TRUE(impatient);
  // The shell holds the file until its standard input ends.
  std::FILE* shell = ::popen(("sqlite3 '" + path + "' >'" + (folder / "said") + "'").c_str(), "w");
  std::fputs("BEGIN EXCLUSIVE;\nSELECT 'locked';\n", shell);
  std::fflush(shell);
  for (int i = 0; i < 500 && contents_of(folder / "said").empty(); ++i) ::usleep(10000);
  ASSERT_EQ(contents_of(folder / "said"), "locked\n");
  const auto stored = impatient->append(made_unit("0002"));
  ASSERT_FALSE(stored);
  EXPECT_THAT(stored.error().finding, HasSubstr("another program keeps the ledger locked"));
  EXPECT_THAT(opening(path), HasSubstr("locked"));
  std::fputs("ROLLBACK;\n", shell);
  ::pclose(shell);
  EXPECT_TRUE(impatient->append(made_unit("0002"))) << "free again";
}

TEST(LedgerTrouble, AReadOnlyFolderCanBeLookedAtOnly) {
  const TemporaryFolder folder;
  const std::string inner = folder / "inner", path = inner + "/a.ledger";
  std::filesystem::create_directory(inner);
  { const Ledger ledger = made_ledger(path, 2); }
  ::chmod(path.c_str(), 0444);
  ::chmod(folder.path().c_str(), 0755);
  ::chmod(inner.c_str(), 0555);
  EXPECT_EQ(in_child([&] { return opening(path); }, true), "opened");
  EXPECT_EQ(in_child([&] { return std::string(Ledger::open({.path = path})->verify()->holds() ? "holds" : "not"); }, true), "holds");
  EXPECT_THAT(in_child([&] { return opening(path, LedgerMode::append); }, true), HasSubstr("can only be read"));
  EXPECT_THAT(in_child([&] { return opening(inner + "/new", LedgerMode::create); }, true), HasSubstr("no ledger may be made in this folder"));
  // The file may be written, but its journal has no place.
  ::chmod(path.c_str(), 0666);
  EXPECT_THAT(in_child([&]() -> std::string {
                auto ledger = Ledger::open({.path = path, .mode = LedgerMode::append});
                if (!ledger) return ledger.error().finding;
                const auto stored = ledger->append(made_unit("0009"));
                return stored ? "stored" : stored.error().finding;
              }, true),
              HasSubstr("or its folder, can only be read"));
  ::chmod(path.c_str(), 0000);
  EXPECT_THAT(in_child([&] { return opening(path); }, ::geteuid() == 0), HasSubstr("no permission"));
  ::chmod(inner.c_str(), 0755);
}

TEST(LedgerTrouble, WhenTheFileMayNotGrowTheBatchIsRefusedAndTheRestStays) {
  const TemporaryFolder folder;
  const std::string path = folder / "a.ledger";
  { const Ledger ledger = made_ledger(path, 25); }
  const std::string said = in_child([&]() -> std::string {
    std::signal(SIGXFSZ, SIG_IGN);
    const rlim_t limit = std::filesystem::file_size(path) + 8192;
    const rlimit size{limit, limit};
    ::setrlimit(RLIMIT_FSIZE, &size);
    auto ledger = Ledger::open({.path = path, .mode = LedgerMode::append});
    if (!ledger) return "not opened: " + ledger.error().finding;
    for (int i = 100; i < 1000; ++i) {
      const auto stored = ledger->append(made_unit(std::to_string(i)));
      if (!stored) return std::to_string(i) + ": " + stored.error().finding + "; then " + (ledger->verify()->holds() ? "holds" : "broken");
    }
    return "all stored";
  });
  EXPECT_THAT(said, HasSubstr("larger than is allowed"));
  EXPECT_THAT(said, HasSubstr("; then holds"));
  const auto ledger = Ledger::open({.path = path, .mode = LedgerMode::append});
  ASSERT_TRUE(ledger);
  EXPECT_EQ(ledger->head()->id, 25 + std::atoi(said.c_str()) - 100) << "all that were acknowledged, and nothing else";
  EXPECT_TRUE(ledger->verify()->holds());
}

TEST(LedgerTrouble, ACutFileIsDamaged) {
  const TemporaryFolder folder;
  const std::string path = folder / "a.ledger";
  { const Ledger ledger = made_ledger(path, 60); }
  std::filesystem::resize_file(path, std::filesystem::file_size(path) / 2);
  const auto ledger = Ledger::open({.path = path});
  if (ledger) {
    const auto check = ledger->verify();
    ASSERT_TRUE(check);
    EXPECT_FALSE(check->holds());
  } else {
    EXPECT_THAT(ledger.error().finding, HasSubstr("damaged"));
  }
}

}  // namespace
}  // namespace coilassay::test

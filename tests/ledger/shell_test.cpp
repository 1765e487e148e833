// The SQLite shell, which knows nothing of this program: it reads a ledger, and cannot change it.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "base/digest.h"
#include "tests/ledger/made_entries.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

class Shell : public testing::Test {
 protected:
  void SetUp() override { const Ledger ledger = made_ledger(path_, 3); }
  ShellEnd says(const std::string& sql) const { return sqlite_shell(path_, sql); }
  void expect_unchanged() const {
    const auto ledger = Ledger::open({.path = path_});
    ASSERT_TRUE(ledger);
    const auto check = ledger->verify();
    ASSERT_TRUE(check);
    EXPECT_TRUE(check->holds()) << check->faults[0].what;
    EXPECT_EQ(check->entries, 3);
  }
  const TemporaryFolder folder_;
  const std::string path_ = folder_ / "a.ledger";
};

TEST_F(Shell, ReadsIt) {
  EXPECT_EQ(says("PRAGMA integrity_check").text, "ok\n");
  EXPECT_EQ(says("SELECT serial, verdict FROM entry ORDER BY id").text, "0001|pass\n0002|pass\n0003|pass\n");
  EXPECT_EQ(says("SELECT json_extract(body, '$.limits[0].value') FROM entry WHERE id = 2").text, "4.7e-05\n");
  EXPECT_EQ(says("PRAGMA journal_mode").text, "delete\n");
  const std::string previous = says("SELECT hash FROM entry WHERE id = 1").text.substr(0, 64);
  const std::string body = says("SELECT body FROM entry WHERE id = 2").text;
  EXPECT_EQ(says("SELECT hash FROM entry WHERE id = 2").text, sha256_of(previous + "\n" + body.substr(0, body.size() - 1)) + "\n");
}

TEST_F(Shell, CannotUpdateOrDelete) {
  for (const char* sql : {"UPDATE entry SET verdict = 'fail' WHERE id = 2", "UPDATE OR IGNORE entry SET body = '' WHERE id = 2",
                          "DELETE FROM entry WHERE id = 3", "DELETE FROM entry", "UPDATE source SET sha256 = ''",
                          "DELETE FROM source WHERE entry = 3",
                          "INSERT INTO entry SELECT * FROM entry WHERE id = 3 ON CONFLICT DO UPDATE SET verdict = 'fail'",
                          "UPDATE entry SET id = 9 WHERE id = 3"}) {
    const ShellEnd end = says(sql);
    EXPECT_NE(end.exit_code, 0) << sql;
    EXPECT_THAT(end.text, HasSubstr("ledger")) << sql;
  }
  expect_unchanged();
}

TEST_F(Shell, CannotReplaceByAnyOfTheUniqueColumns) {
  const std::string columns = "kind, time, part, revision, supplier, sheet_sha256, lot, serial, attempt, 'fail', operator, "
                              "instrument, program, corrects, reason, body, ";
  for (const std::string& sql : {"SELECT id, " + columns + "previous, hash FROM entry WHERE id = 2",
                                 "SELECT 4, " + columns + "previous, 'x' FROM entry WHERE id = 2",
                                 "SELECT 4, " + columns + "(SELECT hash FROM entry WHERE id = 3), hash FROM entry WHERE id = 2"}) {
    for (const char* verb : {"INSERT OR REPLACE INTO entry ", "REPLACE INTO entry ", "INSERT OR IGNORE INTO entry "}) {
      const ShellEnd end = says(verb + sql);
      EXPECT_NE(end.exit_code, 0) << verb << sql;
      EXPECT_THAT(end.text, HasSubstr("only grows at its end")) << verb << sql;
    }
  }
  EXPECT_NE(says("REPLACE INTO source SELECT entry, position, 'x', file, sha256 FROM source WHERE entry = 3").exit_code, 0);
  EXPECT_NE(says("INSERT INTO source VALUES(1, 2, 'x', 'y', 'z')").exit_code, 0);
  expect_unchanged();
}

TEST_F(Shell, CannotPutAnEntryBetweenOrBehindAGap) {
  const std::string columns = "kind, time, part, revision, supplier, sheet_sha256, lot, serial, attempt, verdict, operator, "
                              "instrument, program, corrects, reason, body, (SELECT hash FROM entry WHERE id = 3), 'x' FROM entry WHERE id = 1";
  for (const char* id : {"5", "0", "-1", "NULL", "2"}) {
    EXPECT_NE(says("INSERT INTO entry SELECT " + std::string(id) + ", " + columns).exit_code, 0) << id;
  }
  EXPECT_NE(says("INSERT INTO entry SELECT 4, 'note', time, part, revision, supplier, sheet_sha256, lot, serial, attempt, verdict,"
                 " operator, instrument, program, corrects, reason, body, (SELECT hash FROM entry WHERE id = 3), 'x' FROM entry WHERE id = 1")
                .exit_code, 0) << "a kind there is not";
  expect_unchanged();
}

}  // namespace
}  // namespace coilassay::test

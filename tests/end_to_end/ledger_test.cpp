// A ledger through the program itself: list, show, verify, export, correct.
#include <gmock/gmock.h>
#include <sys/resource.h>

#include <string>
#include <vector>

#include "base/digest.h"
#include "tests/end_to_end/bench.h"
#include "tests/ledger/made_entries.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;
using testing::Not;
using testing::SizeIs;
using nlohmann::json;

class LedgerCommands : public testing::Test {
 protected:
  void SetUp() override {
    Ledger ledger = made_ledger(path_, 4);
    EntryContent odd = made_unit("=cmd|' /C calc'!A0", "fail");
    odd.attempt = 2;
    odd.reason = "@SUM(1)\x1b[31m";
    ASSERT_TRUE(ledger.append(odd));
    ASSERT_TRUE(ledger.append(made_lot("0412", "accept")));
  }
  json document(std::vector<std::string> words, const std::string& schema, int exit_code = 0) const {
    words.push_back("--json");
    const ProgramEnd end = run_program_process(words);
    EXPECT_EQ(end.exit_code, exit_code) << end.out << end.error;
    EXPECT_EQ(schema_trouble(end.out, schema), "");
    return json::parse(end.out);
  }
  const TemporaryFolder folder_;
  const std::string path_ = folder_ / "drum-47.ledger";
};

TEST_F(LedgerCommands, ListShowsEachEntryAndTheHead) {
  const ProgramEnd end = run_program_process({"ledger", "list", path_});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("0003"));
  EXPECT_THAT(end.out, HasSubstr("head: entry 6, "));
  const json all = document({"ledger", "list", path_}, "ledger");
  EXPECT_THAT(all.at("entries"), SizeIs(6));
  EXPECT_EQ(all.at("head"), all.at("entries").back().at("hash"));
  EXPECT_THAT(document({"ledger", "list", path_, "--serial", "0003"}, "ledger").at("entries"), SizeIs(1));
  EXPECT_THAT(document({"ledger", "list", path_, "--kind", "lot"}, "ledger").at("entries"), SizeIs(1));
  EXPECT_THAT(document({"ledger", "list", path_, "--lot", "none"}, "ledger").at("entries"), SizeIs(0));
  EXPECT_EQ(document({"ledger", "list", path_, "--newest", "2"}, "ledger").at("entries").at(0).at("id"), 5);
}

TEST_F(LedgerCommands, ADocumentCarriesWhatTheHashIsMadeOf) {
  for (const json& entry : document({"ledger", "export", path_}, "ledger").at("entries")) {
    EXPECT_EQ(sha256_of(entry.at("previous").get<std::string>() + "\n" + entry.at("body").get<std::string>()), entry.at("hash"));
    EXPECT_EQ(json::parse(entry.at("body").get<std::string>()).at("verdict"), entry.at("verdict"));
  }
}

TEST_F(LedgerCommands, ShowTellsAnEntryWithItsLimits) {
  const ProgramEnd end = run_program_process({"ledger", "show", path_, "5"});
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_THAT(end.out, HasSubstr("attempt 2, of lot 0412: fail"));
  EXPECT_THAT(end.out, HasSubstr("47.00 µH"));
  EXPECT_THAT(end.out, HasSubstr("@SUM(1)\\x1b[31m")) << "escape bytes are shown, not sent to the terminal";
  EXPECT_THAT(end.out, Not(HasSubstr("\x1b")));
  EXPECT_EQ(document({"ledger", "show", path_, "5"}, "ledger").at("entries").at(0).at("limits").at(0).at("value"), 4.7e-05);
  document({"ledger", "show", path_, "7"}, "error", 2);
  document({"ledger", "show", path_, "five"}, "error", 2);
}

TEST_F(LedgerCommands, ACorrectionIsAnEntryThatPointsBack) {
  const json added = document({"ledger", "correct", path_, "2", "--serial", "0022", "--reason", "mistyped", "--operator", "J. Marsh"}, "ledger");
  EXPECT_EQ(added.at("entries").at(0).at("id"), 7);
  EXPECT_EQ(added.at("entries").at(0).at("corrects"), 2);
  EXPECT_EQ(added.at("entries").at(0).at("serial"), "0022");
  EXPECT_EQ(added.at("entries").at(0).at("verdict"), "pass") << "what is not given stays";
  const json second = document({"ledger", "correct", path_, "2", "--verdict", "undecided", "--reason", "contact in doubt"}, "ledger");
  EXPECT_EQ(second.at("entries").at(0).at("serial"), "0022") << "as it stands today";
  const json shown_entry = document({"ledger", "show", path_, "2"}, "ledger");
  EXPECT_EQ(shown_entry.at("entries").at(0).at("serial"), "0002");
  EXPECT_EQ(shown_entry.at("entries").at(0).at("corrected_by"), 8);
  EXPECT_THAT(shown_entry.at("entries"), SizeIs(3));
  EXPECT_THAT(run_program_process({"ledger", "show", path_, "2"}).out, HasSubstr("serial 0002 is 0022. mistyped"));
  EXPECT_TRUE(document({"ledger", "verify", path_}, "verify").at("holds"));
}

TEST_F(LedgerCommands, ACorrectionThatMakesNoSenseIsRefused) {
  document({"ledger", "correct", path_, "2", "--serial", "0022"}, "error", 2);
  document({"ledger", "correct", path_, "2", "--verdict", "accept", "--reason", "x"}, "error", 2);
  document({"ledger", "correct", path_, "6", "--verdict", "pass", "--reason", "x"}, "error", 2);
  document({"ledger", "correct", path_, "6", "--serial", "1", "--reason", "x"}, "error", 2);
  document({"ledger", "correct", path_, "66", "--reason", "x"}, "error", 2);
  EXPECT_EQ(document({"ledger", "verify", path_}, "verify").at("entries"), 6);
}

TEST_F(LedgerCommands, VerifyFindsWhatWasDone) {
  json verified = document({"ledger", "verify", path_}, "verify");
  EXPECT_TRUE(verified.at("holds"));
  const std::string head = verified.at("head");
  EXPECT_EQ(document({"ledger", "verify", path_, "--head", head.substr(0, 8)}, "verify").at("expected_head").at("id"), 6);
  document({"ledger", "verify", path_, "--head", "yes"}, "error", 2);

  sqlite_shell(path_, "DROP TRIGGER source_stays; DROP TRIGGER entry_stays; DELETE FROM source WHERE entry = 6; DELETE FROM entry WHERE id = 6;");
  verified = document({"ledger", "verify", path_, "--head", head}, "verify", 4);
  EXPECT_FALSE(verified.at("holds"));
  EXPECT_THAT(verified.at("faults"), SizeIs(2)) << "the two rules";
  EXPECT_EQ(verified.at("problem"), "ledger") << "the members of an error document are there as well";

  sqlite_shell(path_, "DROP TRIGGER entry_keeps_what_it_says; UPDATE entry SET verdict = 'pass' WHERE id = 5");
  const ProgramEnd end = run_program_process({"ledger", "verify", path_});
  EXPECT_EQ(end.exit_code, 4);
  EXPECT_THAT(end.out, HasSubstr("the column 'verdict' says 'pass', the record itself 'fail'"));
}

TEST_F(LedgerCommands, ADamagedLedgerIsNotShownAsIfItWereWhole) {
  const std::string rules = sqlite_shell(path_, "SELECT sql || ';' FROM sqlite_master WHERE name IN ('entry_stays', 'source_stays')").text;
  sqlite_shell(path_, "DROP TRIGGER source_stays; DROP TRIGGER entry_stays; DELETE FROM source WHERE entry = 3; DELETE FROM entry WHERE id = 3; " + rules);
  document({"ledger", "list", path_}, "error", 4);
  document({"ledger", "show", path_, "2"}, "error", 4);
  const ProgramEnd end = run_program_process({"ledger", "export", path_, "--csv"});
  EXPECT_EQ(end.exit_code, 4);
  EXPECT_EQ(end.out, "");
  EXPECT_THAT(end.error, HasSubstr("the ledger is not what was written"));
}

TEST_F(LedgerCommands, ACutTailShowsByTheHeadOfAReport) {
  const std::string head = document({"ledger", "verify", path_}, "verify").at("head");
  // With the rules put back nothing in the file tells.
  const std::string rule = sqlite_shell(path_, "SELECT sql FROM sqlite_master WHERE name = \"entry_stays\"").text;
  sqlite_shell(path_, "DROP TRIGGER entry_stays; DELETE FROM entry WHERE id = 6; " + rule);
  EXPECT_TRUE(document({"ledger", "verify", path_}, "verify").at("holds"));
  const json verified = document({"ledger", "verify", path_, "--head", head}, "verify", 4);
  EXPECT_EQ(verified.at("expected_head").at("id"), nullptr);
  EXPECT_THAT(verified.at("finding").get<std::string>(), HasSubstr("no entry in it has the hash that was stated"));
}

TEST_F(LedgerCommands, ATableForSpreadsheetsHoldsNoFormula) {
  const std::string file = folder_ / "drum.csv";
  ASSERT_EQ(run_program_process({"ledger", "export", path_, "-o", file}).exit_code, 0);
  const std::string table = contents_of(file);
  EXPECT_THAT(table, HasSubstr("\r\n5,2026-03-04T10:22:00Z,unit,drum-47,C,Reel Hall,0412,'=cmd|' /C calc'!A0,2,fail,"));
  EXPECT_THAT(table, HasSubstr(",'@SUM(1)"));
  EXPECT_THAT(table, HasSubstr(",4.7e-05,2.1e-07,,,fail,"));
  EXPECT_EQ(run_program_process({"ledger", "export", path_, "--csv"}).out, table);
  // Another reader of such tables.
  const std::string check = "import csv,sys; rows=list(csv.reader(open(sys.argv[1],newline=\"\"))); "
                            "assert len(rows)==7 and len({len(r) for r in rows})==1; "
                            "assert not [c for r in rows for c in r if c[:1] in \"=+-@\\t\\r\" and c[:1]]";
  EXPECT_EQ(std::system(("/usr/bin/python3 -c '" + check + "' '" + file + "'").c_str()), 0);
}

TEST_F(LedgerCommands, WhatIsNoLedgerEndsWithFour) {
  document({"ledger", "verify", folder_ / "none"}, "error", 4);
  document({"ledger", "list", folder_.file("table.csv", "a,b\n1,2\n")}, "error", 4);
  document({"ledger", "correct", folder_ / "none", "1", "--reason", "x"}, "error", 4);
  EXPECT_NE(access((folder_ / "none").c_str(), F_OK), 0) << "a correction makes no ledger";
}

TEST_F(LedgerCommands, AFullDiskIsASentence) {
  // A limit stands in for the full disk; both reach the program as a write that fails.
  const rlimit limit{4096, RLIM_INFINITY};
  rlimit before{};
  getrlimit(RLIMIT_FSIZE, &before);
  setrlimit(RLIMIT_FSIZE, &limit);
  const ProgramEnd end = run_program_process({"ledger", "correct", path_, "1", "--reason", std::string(6000, 'x')});
  setrlimit(RLIMIT_FSIZE, &before);
  EXPECT_EQ(end.exit_code, 4) << end.signal;
  EXPECT_THAT(end.error, HasSubstr("larger than is allowed here"));
  EXPECT_TRUE(document({"ledger", "verify", path_}, "verify").at("holds"));
}

}  // namespace
}  // namespace coilassay::test

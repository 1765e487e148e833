// What is written never takes the place of what is read, through the program itself.
#include <gmock/gmock.h>

#include <filesystem>

#include "tests/end_to_end/bench.h"
#include "tests/end_to_end/lot_bench.h"
#include "tests/ledger/made_entries.h"
#include "tests/support/paths.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;
namespace fs = std::filesystem;

/// The command is refused with the option's name, and the file stays as it was.
void expect_spared(const std::string& file, const std::vector<std::string>& words, const std::string& option) {
  const std::string before = contents_of(file);
  const ProgramEnd end = run_program_process(words);
  EXPECT_EQ(end.exit_code, 2) << end.out;
  EXPECT_THAT(end.error, HasSubstr(option + ": "));
  EXPECT_THAT(end.error, HasSubstr("be lost"));
  EXPECT_EQ(contents_of(file), before);
}

TEST(SparedFiles, ALedgerIsNotReplacedByItsExport) {
  const TemporaryFolder folder;
  const std::string ledger = folder / "z.ledger";
  { const Ledger made = made_ledger(ledger, 2); }
  fs::create_symlink(ledger, folder / "link.csv");
  expect_spared(ledger, {"ledger", "export", ledger, "-o", ledger}, "-o");
  expect_spared(ledger, {"ledger", "export", ledger, "--csv", "-o", ledger}, "-o");
  expect_spared(ledger, {"ledger", "export", ledger, "-o", folder / "link.csv"}, "-o");
  EXPECT_EQ(run_program_process({"ledger", "export", ledger, "-o", folder / "out.csv", "--quiet"}).exit_code, 0);
  EXPECT_EQ(run_program_process({"ledger", "export", ledger, "-o", folder / "out.csv", "--quiet"}).exit_code, 0) << "an older export is replaced";
}

TEST(SparedFiles, ATraceReplacesNothingButATrace) {
  const TemporaryFolder folder;
  const std::string profile = folder.file("meter.toml",
                                          "[link]\nkind = \"tcp\"\nport = \"localhost:1\"\nreconnect = \"10 ms\"\n[reading]\nask = \"FETC?\"\n"
                                          "fields = [\"L_s [H]\"]\naccuracy = { L_s = \"0.2 %\" }\n");
  const std::string precious = folder.file("old.csv", "time [s],CH1 [V]\n0,1\n");
  const std::string sheet = folder.file("part.toml",
                                        "[part]\nname = \"drum\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"45 uH\"\nmax = \"49 uH\"\ntest = \"reading\"\n");
  const std::string ledger = folder / "d.ledger";
  { const Ledger made = made_ledger(ledger, 2); }
  expect_spared(precious, {"acquire", profile, "-o", folder / "new.csv", "--trace", precious}, "old.csv");
  expect_spared(precious, {"acquire", profile, "--try", "--trace", precious}, "old.csv");
  expect_spared(profile, {"acquire", profile, "-o", folder / "new.csv", "--trace", profile}, "--trace");
  const std::vector<std::string> station = {"station", sheet, "--instrument", profile, "--lot", "1", "--ledger", ledger, "--trace"};
  for (const auto& [file, option] : {std::pair{precious, "old.csv"}, {ledger, "--trace"}, {sheet, "--trace"}, {profile, "--trace"}}) {
    auto words = station;
    words.push_back(file);
    expect_spared(file, words, option);
  }
  const ProgramEnd both = run_program_process({"acquire", profile, "-o", folder / "new.csv", "--trace", folder / "./new.csv"});
  EXPECT_EQ(both.exit_code, 2);
  EXPECT_THAT(both.error, HasSubstr("the file of -o as well"));
  EXPECT_FALSE(fs::exists(folder / "new.csv"));
  // What stands beside the trace as its older part counts as well; an older trace may go.
  folder.file("talk.trace.1", "precious\n");
  expect_spared(folder / "talk.trace.1", {"acquire", profile, "--try", "--trace", folder / "talk.trace"}, "talk.trace.1");
  const std::string older = folder.file("older.trace", "# coilassay trace of meter.toml, begun long ago\n");
  EXPECT_EQ(run_program_process({"acquire", profile, "--try", "--trace", older}).exit_code, 4);
  EXPECT_THAT(contents_of(older), testing::Not(HasSubstr("long ago")));
}

TEST(SparedFiles, APlayedSessionIsNotItsOwnTrace) {
  const TemporaryFolder folder;
  const std::string trace = folder.file("talk.trace", "# coilassay trace of meter.toml\n");
  const std::string profile = folder.file("meter.toml",
                                          "[link]\nkind = \"recorded\"\nport = \"talk.trace\"\n[reading]\nask = \"FETC?\"\n"
                                          "fields = [\"L_s [H]\"]\naccuracy = { L_s = \"0.2 %\" }\n");
  expect_spared(trace, {"acquire", profile, "-o", folder / "new.csv", "--trace", trace}, "--trace");
  expect_spared(trace, {"acquire", profile, "--try", "--trace", trace}, "--trace");
}

TEST(SparedFiles, APageOfALotReplacesNoneOfItsFiles) {
  const LotBench bench;
  bench.unit("01", 47);
  const std::string page = bench.folder() / "page.html";
  for (const std::string& file : {bench.sheet(), bench.folder() / "bench.toml", bench.lot() + "/01.ringdown.csv"}) {
    fs::create_symlink(file, page);
    expect_spared(file, {"inspect", bench.sheet(), bench.lot(), "--report", page, "--ledger", bench.ledger()}, "--report");
    EXPECT_FALSE(fs::exists(bench.ledger())) << "refused before anything is written";
    fs::remove(page);
  }
  expect_spared(page, {"inspect", bench.sheet(), bench.lot(), "--ledger", page, "--report", page}, "--report");
}

TEST(SparedFiles, ModelsAndFiguresReplaceNoInput) {
  const TemporaryFolder folder;
  const std::string coil = folder / "coil.s1p", set = folder.file("set.toml", "x\n"), law = folder.file("law.json", "{}");
  ASSERT_EQ(run_program_process({"simulate", "sweep", "-o", coil, "--quiet"}).exit_code, 0);
  const std::string bench = folder.file("bench.toml", "[impedance]\naccuracy = \"0.1 %\"\n[fixture]\nset = \"set.toml\"\n");
  expect_spared(coil, {"sweep", coil, "--touchstone", coil}, "--touchstone");
  expect_spared(coil, {"sweep", coil, "--netlist", coil}, "--netlist");
  expect_spared(coil, {"sweep", coil, "--netlist", folder / "one", "--touchstone", folder / "one"}, "--touchstone");
  expect_spared(set, {"sweep", coil, "--fixture", set, "--netlist", set}, "--netlist");
  expect_spared(bench, {"sweep", coil, "--bench", bench, "--netlist", bench}, "--netlist");
  expect_spared(set, {"sweep", coil, "--bench", bench, "--netlist", set}, "--netlist");
  expect_spared(law, {"sweep", coil, "--saturation", law, "--netlist", law}, "--netlist");
  expect_spared(coil, {"coupling", "--primary-open", coil, "--netlist", coil}, "--netlist");
  expect_spared(coil, {"coupling", coil, "--netlist", coil}, "--netlist");
  expect_spared(coil, {"ramp", coil, "--netlist", coil}, "--netlist");
  expect_spared(coil, {"fixture", "tweezers", "--open", coil, "--short", coil, "-o", coil}, "-o");
  const std::string table = folder.file("readings.svg", "part,operator,value\n");
  expect_spared(table, {"gauge", table, "--figure", table}, "--figure");
  fs::create_symlink(bench, folder / "bench.svg");
  expect_spared(bench, {"sweep", coil, "--bench", bench, "--figure", folder / "bench.svg"}, "--figure");
  expect_spared(bench, {"describe", coil, "--bench-out", coil}, "--bench-out");
}

}  // namespace
}  // namespace coilassay::test

// No document takes the place of a file that is read, of a ledger, or of another document.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

/// The command is refused, says so, and every file is as it was.
void expect_spared(const std::vector<std::string>& command, const std::vector<std::string>& files) {
  std::vector<std::string> before;
  for (const std::string& file : files) before.push_back(contents_of(file));
  const ProgramEnd end = run_program_process(command);
  EXPECT_EQ(end.exit_code, 2) << command[0] << ": " << end.out << end.error;
  EXPECT_THAT(end.error, HasSubstr("would be lost"));
  for (std::size_t i = 0; i < files.size(); ++i) EXPECT_EQ(contents_of(files[i]), before[i]) << files[i];
}

TEST(SparedFiles, ACaptureSheetOrLedgerIsNeverReplacedByADocument) {
  const TemporaryFolder folder;
  const std::string sweep = folder / "part.s1p";
  ASSERT_EQ(run_program_process({"simulate", "sweep", "-o", sweep, "--noise", "0.1%"}).exit_code, 0);
  const std::string bench = folder.file("bench.toml", "[timebase]\ntolerance = \"25 ppm\"\n");
  expect_spared({"sweep", sweep, "--touchstone", sweep}, {sweep});
  expect_spared({"sweep", sweep, "--netlist", sweep}, {sweep});
  expect_spared({"sweep", sweep, "--bench", bench, "--netlist", bench}, {bench});
  expect_spared({"sweep", sweep, "--netlist", folder / "one", "--touchstone", folder / "one"}, {sweep});

  ASSERT_EQ(run_program_process({"inspect", "sample-data/drum.toml", "sample-data/drum-lot", "--lot", "T", "--ledger", folder / "a.html", "--quiet"})
                .exit_code, 0);
  const std::string ledger = folder / "a.html";
  expect_spared({"ledger", "export", ledger, "-o", ledger}, {ledger});
  expect_spared({"ledger", "export", ledger, "--csv", "-o", ledger}, {ledger});
  expect_spared({"inspect", "sample-data/drum.toml", "sample-data/drum-lot", "--lot", "T", "--ledger", ledger, "--report", ledger}, {ledger});
}

TEST(SparedFiles, ATraceBeginsAnewOnlyInPlaceOfATrace) {
  const TemporaryFolder folder;
  const std::string kept = folder.file("notes.txt", "what was found on Monday\n");
  expect_spared({"acquire", "sample-data/instruments/meter.toml", "-o", folder / "run.csv", "--count", "1", "--trace", kept}, {kept});
  expect_spared({"acquire", "sample-data/instruments/meter.toml", "-o", folder / "run.csv", "--count", "1", "--trace", folder / "run.csv"}, {kept});
}

}  // namespace
}  // namespace coilassay::test

// Full disks, closed streams and readers that go away.
#include <gmock/gmock.h>

#include <csignal>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

TEST(Streams, AFullDiskIsNoticed) {
  ProgramStart start;
  start.out_file = "/dev/full";
  for (const auto& arguments : std::vector<std::vector<std::string>>{
           {"help", "ringdown"}, {"--version"}, {"man"}, {"simulate", "ringdown", "-o", "-", "--samples", "50000"}}) {
    start.arguments = arguments;
    const ProgramEnd end = run_program_process(start);
    EXPECT_EQ(end.exit_code, 2) << arguments.front();
    EXPECT_THAT(end.error,
                HasSubstr("standard output: not all of the result could be written: No space left on device"));
  }
}

TEST(Streams, AClosedStandardOutputIsNoticed) {
  ProgramStart start;
  start.arguments = {"--version"};
  start.out_closed = true;
  const ProgramEnd end = run_program_process(start);
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_THAT(end.error, HasSubstr("standard output: not all of the result could be written: Bad file descriptor"));
}

TEST(Streams, AClosedStandardOutputDoesNotSpillIntoFiles) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv", page = folder / "page.html";
  simulate_into(ring, {"--samples", "3000", "--noise", "1mV"});
  ProgramStart start;
  start.arguments = {"ringdown", ring, "--capacitor", "10nF", "--report", page};
  start.out_closed = true;
  const std::string before = contents_of(ring);
  EXPECT_EQ(run_program_process(start).exit_code, 2);
  EXPECT_EQ(contents_of(ring), before);
  EXPECT_TRUE(contents_of(page).starts_with("<!")) << "the page holds only the page";
}

TEST(Streams, AReaderThatGoesAwayEndsNothing) {
  ProgramStart start;
  start.arguments = {"help", "--markdown"};
  start.out_abandoned = true;
  const ProgramEnd end = run_program_process(start);
  EXPECT_EQ(end.signal, 0);
  EXPECT_EQ(end.exit_code, 0);
  EXPECT_EQ(end.error, "");
}

TEST(Streams, AFileThatCannotBeWrittenIsNamed) {
  const TemporaryFolder folder;
  const ProgramEnd end = run_program_process({"simulate", "ringdown", "-o", folder / "no/such/ring.csv"});
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_TRUE(end.error.starts_with(folder / "no/such/ring.csv")) << end.error;
  EXPECT_THAT(end.error, HasSubstr("  try: "));
}

TEST(Streams, ColourIsKeptOffPipes) {
  ProgramStart start;
  start.arguments = {"help", "ringdown"};
  start.environment = {"TERM=xterm-256color"};
  EXPECT_THAT(run_program_process(start).out, testing::Not(HasSubstr("\x1b")));
}

TEST(Reference, IsWrittenByTheProgramItself) {
  EXPECT_EQ(run_program_process({"help", "--markdown"}).out, contents_of("docs/commands.md"));
}

}  // namespace
}  // namespace coilassay::test

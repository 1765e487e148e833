#include "report/child_process.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <chrono>
#include <fstream>

#include "tests/report/path_setting.h"

namespace coilassay {
namespace {

using namespace std::chrono_literals;

/// Runs a program of the system in a scratch folder of its own.
Result<ChildOutcome> run(const std::string& program, std::vector<std::string> arguments, std::string input = {},
                         std::chrono::milliseconds limit = 10s, std::size_t output_limit = 64u << 20) {
  const auto scratch = ScratchFolder::make();
  return run_child({find_program(program).value_or(program), std::move(arguments), std::move(input), scratch->path(),
                    limit, output_limit});
}

TEST(ChildProcess, PassesManyBytesThroughBothWays) {
  std::string bytes(3'000'000, 'x');
  for (std::size_t i = 0; i < bytes.size(); i += 97) bytes[i] = static_cast<char>(i % 251);
  const auto outcome = run("cat", {}, bytes);
  ASSERT_TRUE(outcome) << outcome.error().finding;
  EXPECT_EQ(outcome->exit_code, 0);
  EXPECT_TRUE(outcome->output == bytes);
}

TEST(ChildProcess, SeesNothingOfOurEnvironmentButPath) {
  ::setenv("COILASSAY_SECRET", "x", 1);
  const auto outcome = run("env", {});
  ASSERT_TRUE(outcome);
  EXPECT_EQ(outcome->output.find("COILASSAY_SECRET"), std::string::npos);
  EXPECT_NE(outcome->output.find("LC_ALL=C\n"), std::string::npos);
}

TEST(ChildProcess, ArgumentsAreNotReadByAShell) {
  const auto outcome = run("echo", {"$(id)", "`id`", ";", "*"});
  ASSERT_TRUE(outcome);
  EXPECT_EQ(outcome->output, "$(id) `id` ; *\n");
}

TEST(ChildProcess, TellsExitCodesAndMessages) {
  const auto outcome = run("ls", {"/no/such/folder"});
  ASSERT_TRUE(outcome);
  EXPECT_NE(outcome->exit_code, 0);
  EXPECT_FALSE(outcome->messages.empty());
}

// The child's own child holds the output open: both must go, and nobody waits for ten minutes.
TEST(ChildProcess, EndsWithEverythingItStartedAtTheTimeLimit) {
  const auto begin = std::chrono::steady_clock::now();
  const auto outcome = run("sh", {"-c", "sleep 600 & echo $!; wait"}, "", 300ms);
  ASSERT_FALSE(outcome);
  EXPECT_EQ(outcome.error().problem, Problem::missing_helper);
  EXPECT_LT(std::chrono::steady_clock::now() - begin, 5s);
}

TEST(ChildProcess, DoesNotWaitForAGrandchildThatKeepsTheOutput) {
  const auto begin = std::chrono::steady_clock::now();
  const auto outcome = run("sh", {"-c", "sleep 600 & echo done"});
  ASSERT_TRUE(outcome);
  EXPECT_EQ(outcome->output, "done\n");
  EXPECT_LT(std::chrono::steady_clock::now() - begin, 5s);
}

TEST(ChildProcess, StopsOneThatWritesWithoutEnd) {
  const auto outcome = run("yes", {}, "", 10s, 1u << 20);
  ASSERT_FALSE(outcome);
  EXPECT_EQ(outcome.error().problem, Problem::missing_helper);
}

// A child that never reads must not end us with a broken pipe.
TEST(ChildProcess, SurvivesAChildThatDoesNotRead) {
  const auto outcome = run("true", {}, std::string(10'000'000, 'x'));
  ASSERT_TRUE(outcome);
  EXPECT_EQ(outcome->exit_code, 0);
}

TEST(ChildProcess, AProgramThatIsNotThereIsAFailure) {
  const auto outcome = run("/no/such/program", {});
  ASSERT_FALSE(outcome);
  EXPECT_EQ(outcome.error().problem, Problem::missing_helper);
}

TEST(FindProgram, SkipsEmptyAndRelativeFoldersOfPath) {
  const auto scratch = ScratchFolder::make();
  ASSERT_TRUE(scratch);
  const auto file = scratch->path() / "coilassay-test-tool";
  std::ofstream(file) << "#!/bin/sh\n";
  std::filesystem::permissions(file, std::filesystem::perms::owner_all);
  const auto relative = std::filesystem::relative(scratch->path()).string();
  {
    const test::PathSetting path(":" + relative + ":.:");
    EXPECT_FALSE(find_program("coilassay-test-tool"));
  }
  const test::PathSetting path("/no/such:" + scratch->path().string());
  EXPECT_EQ(find_program("coilassay-test-tool"), file.string());
  EXPECT_FALSE(find_program("coilassay-other-tool"));
}

TEST(ScratchFolder, IsPrivateAndGoesWithEverythingInIt) {
  std::filesystem::path where;
  {
    const auto scratch = ScratchFolder::make();
    ASSERT_TRUE(scratch);
    where = scratch->path();
    EXPECT_EQ(std::filesystem::status(where).permissions(), std::filesystem::perms::owner_all);
    std::filesystem::create_directories(where / "a/b");
    std::ofstream(where / "a/b/c") << "x";
  }
  EXPECT_FALSE(std::filesystem::exists(where));
}

}  // namespace
}  // namespace coilassay

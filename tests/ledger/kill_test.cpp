// A writer killed at random moments loses nothing it acknowledged. (200 kills: tests/proof/ledger_kills.cpp)
#include <gtest/gtest.h>

#include "tests/ledger/killed_writer.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

TEST(LedgerKill, LosesNothingThatWasAcknowledgedAndGoesOn) {
  const TemporaryFolder folder;
  const KillTally tally = kill_again_and_again(folder / "a.ledger", 20, 1);
  EXPECT_EQ(tally.trouble, "");
  EXPECT_EQ(tally.kills, 20);
  EXPECT_GT(tally.acknowledged, 100) << "the writers hardly wrote, so that nothing was tried";
  EXPECT_GE(tally.stored, tally.acknowledged);
}

}  // namespace
}  // namespace coilassay::test

// An inspection that is killed loses nothing it told; twenty times here, two hundred in tests/proof/inspection_kills.cpp.
#include <gtest/gtest.h>

#include "tests/support/killed_inspection.h"

namespace coilassay::test {
namespace {

TEST(InspectKilled, KeepsEveryUnitItToldAndGoesOnWhereItStopped) {
  const InspectionKills tally = kill_inspections(40, 20, 1);
  EXPECT_EQ(tally.trouble, "");
  EXPECT_EQ(tally.kills, 20);
  EXPECT_GT(tally.acknowledged, 40) << "kills that come before anything is told prove nothing";
}

}  // namespace
}  // namespace coilassay::test

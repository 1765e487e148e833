// A writer of a ledger is killed 200 times at random moments: nothing it acknowledged is lost, the ledger holds after every kill,
// and the next writer goes on where it stopped.
#include <cstdio>

#include "tests/ledger/killed_writer.h"
#include "tests/support/program.h"

int main() {
  using namespace coilassay::test;
  const TemporaryFolder folder;
  const KillTally tally = kill_again_and_again(folder / "a.ledger", 200, 1);
  std::printf("%d kills, %lld entries acknowledged, %lld stored%s%s\n", tally.kills, static_cast<long long>(tally.acknowledged),
              static_cast<long long>(tally.stored), tally.trouble.empty() ? "" : ", trouble: ", tally.trouble.c_str());
  return tally.trouble.empty() && tally.kills == 200 && tally.acknowledged > 1000 ? 0 : 1;
}

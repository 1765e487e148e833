// inspect --ledger --follow is killed 200 times at random moments: no unit it told of is lost, the ledger holds after every kill,
// and the run that reaches the decision finds every unit exactly once.
#include <cstdio>
#include <cstdlib>

#include "tests/support/killed_inspection.h"

int main(int argc, char** argv) {
  const int kills = argc > 1 ? std::atoi(argv[1]) : 200;
  const coilassay::test::InspectionKills tally = coilassay::test::kill_inspections(120, kills, 1);
  std::printf("%d kills, %d runs reached the decision, %lld units acknowledged%s%s\n", tally.kills, tally.finished,
              static_cast<long long>(tally.acknowledged), tally.trouble.empty() ? "" : ", trouble: ", tally.trouble.c_str());
  return tally.trouble.empty() && tally.kills == kills && tally.acknowledged > kills ? 0 : 1;
}

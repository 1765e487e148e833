// Inspections of a lot that are killed at random moments, each followed by a look at the ledger; for the tests and the
// full-size claim.
#pragma once

#include <cstdint>
#include <string>

namespace coilassay::test {

struct InspectionKills {
  int kills = 0;                   // of runs that had not ended by themselves
  int finished = 0;                // runs that reached the decision, each then began a new ledger
  std::int64_t acknowledged = 0;   // lines of units read in all, stored by the run that wrote them
  std::string trouble;             // the first thing that was not as it must be; empty: none
};

/// Simulates a lot of so many units in a folder of its own and inspects it with --ledger --follow, killing (SIGKILL) after a
/// random number of lines and a random while. After every kill: `verify` holds and every acknowledged unit stands in the
/// ledger as it was told. A run that is let to its end finds every unit exactly once.
InspectionKills kill_inspections(int units, int kills, std::uint64_t seed);

}  // namespace coilassay::test

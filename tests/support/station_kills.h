// A station that is killed again and again: is every verdict that was shown in the ledger?
#pragma once

#include <cstdint>
#include <string>

namespace coilassay::test {

struct StationKills {
  int kills = 0;
  std::size_t shown = 0;            // verdicts that came out
  std::size_t not_in_ledger = 0;    // of them missing there, or with another verdict
  std::size_t shown_twice = 0;      // a unit judged again although it was shown
  std::size_t recorded = 0;         // units in the ledger at the end
  bool chain_holds = false;
};

/// Starts `station --follow` on one lot, types serials as fast as verdicts come, kills it after some of them and a random
/// time, and starts it again with the serials whose verdicts were not seen, until it was killed so often.
StationKills kill_station(int kills, std::uint64_t seed);

}  // namespace coilassay::test

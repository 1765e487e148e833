// Two hundred kills of a station: every verdict that was shown is in the ledger, and the chain holds.
#include <cstdio>
#include <cstdlib>

#include "tests/support/station_kills.h"

int main(int argc, char** argv) {
  const int kills = argc > 1 ? std::atoi(argv[1]) : 200;
  const auto result = coilassay::test::kill_station(kills, 1);
  std::printf("kills %d, verdicts shown %zu, of them not in the ledger %zu, shown twice %zu, recorded %zu, chain %s\n", result.kills, result.shown,
              result.not_in_ledger, result.shown_twice, result.recorded, result.chain_holds ? "holds" : "BROKEN");
  const bool fine = result.kills == kills && result.not_in_ledger == 0 && result.shown_twice == 0 && result.chain_holds &&
                    result.shown > static_cast<std::size_t>(kills) / 2;
  std::printf("%s\n", fine ? "holds" : "FAILS");
  return fine ? 0 : 1;
}

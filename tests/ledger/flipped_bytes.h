// A ledger with one byte turned round at a time; for the tests and the full-size claim.
#pragma once

#include <cstdint>
#include <fstream>
#include <string>
#include <vector>

#include "tests/ledger/made_entries.h"
#include "tests/support/program.h"

namespace coilassay::test {

struct FlipTally {
  std::size_t flips = 0;
  std::size_t noticed = 0;                // not opened, or verify does not hold
  std::size_t without_effect = 0;         // verify holds, and every entry still reads the same: the byte carries nothing
  std::vector<std::size_t> missed;        // positions where a changed record went unnoticed
};

/// Everything an entry says, columns read from outside included.
inline std::string all_of(const std::string& path) {
  return sqlite_shell(path, "SELECT * FROM entry ORDER BY id; SELECT * FROM source ORDER BY entry, position").text;
}

/// Turns one bit of every `step`th byte of the file round, starting at `first`.
inline FlipTally flip_bytes(const TemporaryFolder& folder, std::size_t first, std::size_t step) {
  const std::string path = folder / "flip.ledger";
  { const Ledger ledger = made_ledger(path, 3); }
  const std::string good = contents_of(path), records = all_of(path);
  FlipTally tally;
  for (std::size_t at = first; at < good.size(); at += step) {
    if (good[at] == '\0' && at % 4096 > 100) continue;  // free space; what is used begins with a page's header
    std::string bad = good;
    bad[at] = static_cast<char>(bad[at] ^ (1 << (at % 8)));
    std::ofstream(path, std::ios::binary) << bad;
    ++tally.flips;
    const auto ledger = Ledger::open({.path = path});
    const auto check = ledger ? ledger->verify() : Result<LedgerCheck>(failure(Problem::ledger, "", "", ""));
    if (!check || !check->holds()) ++tally.noticed;
    else if (all_of(path) == records) ++tally.without_effect;
    else tally.missed.push_back(at);
  }
  return tally;
}

}  // namespace coilassay::test

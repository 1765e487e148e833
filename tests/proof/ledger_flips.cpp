// Every byte of a ledger's file is turned round, one at a time: either it is noticed, or every record still reads the same.
#include <cstdio>

#include "tests/ledger/flipped_bytes.h"

int main() {
  using namespace coilassay::test;
  const TemporaryFolder folder;
  const FlipTally tally = flip_bytes(folder, 0, 1);
  std::printf("%zu bytes flipped, %zu noticed, %zu without effect on any record, %zu missed\n", tally.flips, tally.noticed,
              tally.without_effect, tally.missed.size());
  for (const std::size_t at : tally.missed) std::printf("  missed: byte %zu\n", at);
  return tally.missed.empty() && tally.noticed > 5000 ? 0 : 1;
}

// A writer that is killed while it adds, again and again; for the tests and the full-size claim.
#pragma once

#include <unistd.h>

#include <chrono>
#include <cstdint>
#include <string>
#include <thread>
#include <vector>

#include <csignal>
#include <sys/wait.h>

#include "base/random.h"
#include "tests/ledger/made_entries.h"

namespace coilassay::test {

struct KillTally {
  int kills = 0;
  std::int64_t acknowledged = 0;  // entries whose storing was reported before the kill
  std::int64_t stored = 0;
  std::string trouble;            // the first thing that was not as it must be; empty: none
};

/// Adds batches of 1 .. 25 and reports the last id of each through the pipe once it is stored.
[[noreturn]] inline void add_until_killed(const std::string& path, int report, std::uint64_t seed) {
  auto ledger = Ledger::open({.path = path, .mode = LedgerMode::create});
  if (!ledger) ::_exit(2);
  Random random(seed);
  std::int64_t next = ledger->head()->id + 1;  // goes on where the one before stopped
  while (true) {
    std::vector<EntryContent> batch;
    const auto size = 1 + static_cast<std::size_t>(random.uniform() * 25);
    for (std::size_t i = 0; i < size && i < kLargestBatch; ++i) batch.push_back(made_unit(std::to_string(next++)));
    const auto stored = ledger->append(batch);
    if (!stored) ::_exit(3);
    const std::int64_t last = stored->back().id;
    if (::write(report, &last, sizeof last) != sizeof last) ::_exit(4);
  }
}

/// One start, one kill a moment after up to ten batches were acknowledged, then a look at the file.
inline void kill_once(const std::string& path, Random& random, std::uint64_t seed, KillTally& tally) {
  int ends[2];
  if (::pipe(ends) != 0) return;
  const pid_t child = ::fork();
  if (child == 0) {
    ::close(ends[0]);
    add_until_killed(path, ends[1], seed);
  }
  ::close(ends[1]);
  // Counted in batches and not in time alone: a slow disk or a busy machine must not leave the writers without a chance.
  std::int64_t last = 0;
  const auto batches = static_cast<int>(11 * random.uniform());
  for (int i = 0; i < batches && ::read(ends[0], &last, sizeof last) == sizeof last; ++i) tally.acknowledged = last;
  std::this_thread::sleep_for(std::chrono::microseconds(static_cast<int>(15e3 * random.uniform())));
  ::kill(child, SIGKILL);
  int status = 0;
  ::waitpid(child, &status, 0);
  ++tally.kills;
  if (WIFEXITED(status)) tally.trouble = "the writer ended by itself with " + std::to_string(WEXITSTATUS(status));
  while (::read(ends[0], &last, sizeof last) == sizeof last) tally.acknowledged = last;
  ::close(ends[0]);

  const auto ledger = Ledger::open({.path = path});
  if (!ledger) {
    // Killed before the first file was there: nothing was acknowledged then.
    if (tally.acknowledged > 0 || ::access(path.c_str(), F_OK) == 0) tally.trouble = ledger.error().finding;
    return;
  }
  const auto check = ledger->verify();
  if (!check) tally.trouble = check.error().finding;
  else if (!check->holds()) tally.trouble = check->faults[0].what;
  else if (check->head.id < tally.acknowledged) tally.trouble = "acknowledged entries are lost";
  else tally.stored = check->head.id;
}

inline KillTally kill_again_and_again(const std::string& path, int kills, std::uint64_t seed) {
  KillTally tally;
  Random random(seed);
  for (int i = 0; i < kills && tally.trouble.empty(); ++i) kill_once(path, random, seed + 1 + static_cast<std::uint64_t>(i), tally);
  return tally;
}

}  // namespace coilassay::test

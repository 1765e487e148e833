// A hundred thousand units through an instrument of which one reply in twenty goes wrong: not one reading on a wrong unit, no
// hang, no growth of memory.
#include <cstdio>
#include <cstdlib>
#include <fstream>
#include <string>

#include "tests/support/instrument_bench.h"

namespace {

/// Resident memory in KiB, as the system counts it.
long resident_kib() {
  std::ifstream status("/proc/self/status");
  for (std::string line; std::getline(status, line);) {
    if (line.starts_with("VmRSS:")) return std::strtol(line.c_str() + 6, nullptr, 10);
  }
  return 0;
}

}  // namespace

int main(int argc, char** argv) {
  using namespace coilassay::test;
  const std::uint64_t units = argc > 1 ? std::strtoull(argv[1], nullptr, 10) : 100'000;
  const UnitsMeasured warm = measure_units(units / 20 + 100, five_percent(), 1);
  const long before = resident_kib();
  const UnitsMeasured all = measure_units(units, five_percent(), 2);
  const long grown = resident_kib() - before;
  std::printf("units %llu, read %llu, over range %llu, refused %llu, on a wrong unit %llu\n", static_cast<unsigned long long>(all.units),
              static_cast<unsigned long long>(all.read), static_cast<unsigned long long>(all.over_range),
              static_cast<unsigned long long>(all.refused), static_cast<unsigned long long>(all.wrong_unit));
  std::printf("replies gone wrong %llu, time-outs %llu, resynchronised %llu, reconnected %llu, stale bytes %llu\n",
              static_cast<unsigned long long>(all.misbehaved), static_cast<unsigned long long>(all.timeouts),
              static_cast<unsigned long long>(all.resynchronisations), static_cast<unsigned long long>(all.reconnections),
              static_cast<unsigned long long>(all.stale_bytes));
  std::printf("a unit with one disturbance: median %.0f ms, 95 %% within %.0f ms; longest unit %.0f ms; memory grew by %ld KiB\n",
              1000 * all.median_recovery_s, 1000 * all.most_recoveries_within_s, 1000 * all.longest_s, grown);
  // A time-out (50 ms) and two of them to recover; the median of those disturbed once lies well within. Memory: a page or two of
  // the allocator is no growth.
  const bool fine = warm.wrong_unit == 0 && all.wrong_unit == 0 && all.units == units && all.refused == 0 && all.misbehaved > units / 25 &&
                    all.most_recoveries_within_s < 0.15 && all.longest_s < 10 && grown < 1024;
  std::printf("%s\n", fine ? "holds" : "FAILS");
  return fine ? 0 : 1;
}

// Claim: of 2000 clean pairs of windings at most 10 raise a caution or a refusal. Exit 1 otherwise. Argument: pairs.
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <string>
#include <vector>

#include "base/parallel.h"
#include "tests/support/coupled_bench.h"

int main(int argc, char** argv) {
  using namespace coilassay;
  const int pairs = argc > 1 ? std::atoi(argv[1]) : 2000;
  std::vector<std::string> raised(static_cast<std::size_t>(pairs));
  for_each_index(raised.size(), 2, [&](std::size_t i) { raised[i] = test::clean_pair_alarm(i); });
  int alarms = 0;
  for (std::size_t i = 0; i < raised.size(); ++i) {
    if (raised[i].empty()) continue;
    ++alarms;
    std::printf("%5zu %s\n", i, raised[i].c_str());
  }
  std::printf("%d of %d clean pairs raised a caution or a refusal (limit 10 in 2000)\n", alarms, pairs);
  return alarms * 200 <= pairs ? 0 : 1;
}

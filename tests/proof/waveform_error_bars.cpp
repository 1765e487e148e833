// Claim: the error bars of sweeps made from waveforms are true within 10 % for noise and for pulses, and for chirps either true
// or withheld: r.m.s. of (error / stated error) over all points of a cell between 0.90 and 1.10 (chirps: at most 1.10).
//
// Cells: kind of burst, noise of the channels, converter. Exact bench; the part of the error that moves all points is counted
// where it is not nothing. Exit 1 when a limit is missed. Argument: records per cell (default 200).
#include <cstdio>
#include <cstdlib>
#include <string>
#include <vector>

#include "tests/support/burst_bench.h"

namespace {

using namespace coilassay;
using synthetic::BurstKind;
using synthetic::DrivenBurstBench;

struct Cell {
  const char* name;
  DrivenBurstBench bench;
  double least, most;   // of the ratio
  bool withheld = false;
};

DrivenBurstBench bench_of(BurstKind kind, double volts, double amps, int bits) {
  DrivenBurstBench b;
  b.kind = kind;
  b.voltage_noise_v = volts;
  b.current_noise_a = amps;
  b.bits = bits;
  b.parallel_resistance_ohm = 20e3;
  if (kind == BurstKind::noise) b.samples = 200000;
  return b;
}

std::vector<Cell> cells() {
  std::vector<Cell> all;
  for (const double level : {1.0, 5.0}) {
    const char* size = level > 1 ? "more" : "less";
    (void)size;
    all.push_back({level > 1 ? "noise, 50 mV" : "noise, 10 mV", bench_of(BurstKind::noise, 0.01 * level, 0, 0), 0.9, 1.1});
    all.push_back({level > 1 ? "noise, 50 mV and 0.5 mA" : "noise, 10 mV and 0.1 mA", bench_of(BurstKind::noise, 0.01 * level, 1e-4 * level, 0), 0.9, 1.1});
    all.push_back({level > 1 ? "pulse, 10 mV" : "pulse, 2 mV", bench_of(BurstKind::pulse, 0.002 * level, 0, 0), 0.9, 1.1});
    all.push_back({level > 1 ? "pulse, 10 mV and 50 uA" : "pulse, 2 mV and 10 uA", bench_of(BurstKind::pulse, 0.002 * level, 1e-5 * level, 0), 0.9, 1.1});
    all.push_back({level > 1 ? "chirp at rest, 50 mV and 0.5 mA" : "chirp at rest, 10 mV and 0.1 mA", bench_of(BurstKind::chirp, 0.01 * level, 1e-4 * level, 0), 0, 1.1});
  }
  all.push_back({"noise, 12 bit", bench_of(BurstKind::noise, 0.005, 1e-5, 12), 0.9, 1.1});
  all.push_back({"pulse, 12 bit, dithered", bench_of(BurstKind::pulse, 0.003, 2e-5, 12), 0.9, 1.1});
  Cell cut{"chirp that is cut", bench_of(BurstKind::chirp, 0.01, 1e-4, 0), 0, 1.1, true};
  cut.bench.filled = 1;
  cut.bench.samples = 100000;
  all.push_back(cut);
  return all;
}

}  // namespace

int main(int count, char** words) {
  const int records = count > 1 ? std::atoi(words[1]) : 200;
  bool holds = true;
  for (const Cell& cell : cells()) {
    test::BarCheck check;
    int given = 0;
    double points = 0;
    std::string method;
    for (int r = 0; r < records; ++r) {
      DrivenBurstBench bench = cell.bench;
      bench.seed = 100 + static_cast<std::uint64_t>(r);
      const auto record = synthetic::simulate_driven_burst(bench);
      const auto swept = sweep_of_waveforms({&record->capture, 1}, test::exact_burst_request(bench));
      if (!swept || !swept->sweep) continue;
      ++given;
      points += static_cast<double>(swept->sweep->frequency_hz.size());
      method = swept->method;
      check.add(*swept, bench);
    }
    const bool fine = cell.withheld ? given == 0 || check.ratio() < cell.most
                                    : given == records && check.ratio() > cell.least && check.ratio() < cell.most;
    holds = holds && fine;
    std::printf("%-34s %4d of %d given, %7.0f points each, error/stated %.3f (random alone %.3f), worst %.2g  %s\n", cell.name, given, records,
                given > 0 ? points / given : 0.0, given > 0 ? check.ratio() : 0.0, given > 0 ? check.random_ratio() : 0.0, check.worst,
                fine ? "" : "DOES NOT HOLD");
    if (given > 0 && records <= 3) std::printf("   %s\n", method.c_str());
  }
  return holds ? 0 : 1;
}

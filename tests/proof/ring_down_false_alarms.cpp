// Claim: of 2000 clean captures at most 10 raise a caution or a refusal. Exit 1 otherwise. Argument: captures.
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <map>
#include <string>
#include <vector>

#include "acquire/synthetic/ring_down.h"
#include "analysis/ring_down.h"
#include "base/parallel.h"
#include "base/random.h"

int main(int argc, char** argv) {
  using namespace coilassay;
  const int captures = argc > 1 ? std::atoi(argv[1]) : 2000;
  std::vector<std::string> raised(static_cast<std::size_t>(captures));
  for_each_index(raised.size(), 2, [&](std::size_t i) {
    Random random(i, 31);
    synthetic::RingDownBench bench;
    bench.inductance_h = std::pow(10, random.uniform(-6, -2));
    bench.capacitance_f = std::pow(10, random.uniform(-9, -7));
    const double q = std::pow(10, random.uniform(-0.3, 3.0));
    const double reactance = std::sqrt(bench.inductance_h / bench.capacitance_f);
    bench.resistance_ohm = reactance / q;
    bench.probe_resistance_ohm = 1e12;
    bench.probe_capacitance_f = 0;
    bench.initial_current_a = 1 / reactance;
    bench.initial_voltage_v = random.uniform(-0.5, 0.5);
    bench.samples = static_cast<std::size_t>(std::pow(10, random.uniform(3, 4.7)));
    bench.noise_v = std::pow(10, -random.uniform(1, 3));
    const int bits[] = {0, 8, 10, 12};
    bench.bits = bits[i % 4];
    bench.pretrigger_fraction = random.uniform(0, 0.4);
    bench.seed = i;
    const auto record = synthetic::simulate_ring_down(bench);
    if (!record) {
      raised[i] = "simulation: " + record.error().finding;
      return;
    }
    RingDownRequest request;
    request.bench.capacitors.push_back({StatedValue::rectangular(bench.capacitance_f, 0.01 * bench.capacitance_f, Unit::farad),
                                        StatedValue::exact(0, Unit::one)});
    request.bench.voltage.input_capacitance = StatedValue::exact(0, Unit::farad);
    request.bench.voltage.input_resistance = StatedValue::exact(1e12, Unit::ohm);
    const auto result = measure_ring_down(record->capture, request);
    if (!result) {
      raised[i] = result.error().finding;
      return;
    }
    for (const Finding& finding : result->findings) {
      if (finding.severity == Severity::note) continue;
      char text[200];
      std::snprintf(text, sizeof text, "%s (Q %.2f, noise %.4f, %d bits, %zu samples, pre-trigger %.2f)", finding.code.c_str(),
                    q, bench.noise_v, bench.bits, bench.samples, bench.pretrigger_fraction);
      raised[i] = text;
      break;
    }
  });
  int alarms = 0;
  for (std::size_t i = 0; i < raised.size(); ++i) {
    if (raised[i].empty()) continue;
    ++alarms;
    std::printf("%5zu %s\n", i, raised[i].c_str());
  }
  std::printf("%d of %d clean captures raised a caution or a refusal (limit 10 in 2000)\n", alarms, captures);
  return alarms * 200 <= captures ? 0 : 1;
}

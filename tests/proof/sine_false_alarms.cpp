// Claim: of 2000 clean steady sines at most 10 raise a caution or a refusal. Exit 1 otherwise. Argument: captures.
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <numbers>
#include <string>
#include <vector>

#include "acquire/synthetic/driven_sine.h"
#include "analysis/sine.h"
#include "base/parallel.h"
#include "base/random.h"

int main(int argc, char** argv) {
  using namespace coilassay;
  const int captures = argc > 1 ? std::atoi(argv[1]) : 2000;
  std::vector<std::string> raised(static_cast<std::size_t>(captures));
  for_each_index(raised.size(), 2, [&](std::size_t i) {
    Random random(i, 31);
    synthetic::DrivenSineBench bench;
    bench.frequency_hz = std::pow(10, random.uniform(2, 6));
    bench.inductance_h = std::pow(10, random.uniform(-5, -2));
    const double x = 2 * std::numbers::pi * bench.frequency_hz * bench.inductance_h;
    const double q = std::pow(10, random.uniform(-0.3, 1.7));
    bench.resistance_ohm = x / q;
    bench.phase_rad = random.uniform(0, 6.28);
    bench.samples = static_cast<std::size_t>(std::pow(10, random.uniform(3, 4.7)));
    const double cycles = random.uniform(2, std::fmin(400, static_cast<double>(bench.samples) / 8));
    bench.sample_interval_s = cycles / bench.frequency_hz / static_cast<double>(bench.samples);
    const double current = 1 / std::hypot(x, bench.resistance_ohm);
    bench.voltage_noise_v = std::pow(10, -random.uniform(1.5, 3));
    bench.current_noise_a = current * std::pow(10, -random.uniform(1.5, 3));
    const int bits[] = {0, 8, 10, 12};
    bench.bits = bits[i % 4];
    bench.seed = i;
    const auto record = synthetic::simulate_driven_sine(bench);
    if (!record) {
      raised[i] = "simulation: " + record.error().finding;
      return;
    }
    SineRequest request;
    // A bench whose skew is known well enough for this Q.
    request.bench.current.skew = StatedValue::rectangular(0, 0.05 / q / (2 * std::numbers::pi * bench.frequency_hz), Unit::second);
    const auto result = measure_sine(record->capture, request);
    if (!result) {
      raised[i] = result.error().finding;
      return;
    }
    for (const Finding& finding : result->findings) {
      if (finding.severity == Severity::note) continue;
      char text[200];
      std::snprintf(text, sizeof text, "%s (Q %.2f, %.1f cycles, %zu samples, %d bits)", finding.code.c_str(), q, cycles,
                    bench.samples, bench.bits);
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

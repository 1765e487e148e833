// Speed of fit_sines against what a practitioner writes with SciPy (sine_peer.py). Both answers are checked against the
// truth before anything is timed; runs are interleaved, and ratios of one session are printed, by the clock and by
// processor time. Exit 1 only for a wrong answer.
//
// usage (in the source folder): sine_benchmark [SAMPLES...]   (default 10000 1000000 10000000)
#include <algorithm>
#include <chrono>
#include <cmath>
#include <complex>
#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <numbers>
#include <string>
#include <vector>

#include "base/random.h"
#include "fitting/sine_fit.h"

namespace {

using namespace coilassay;

struct Record {
  std::vector<double> v, i;
  double omega = 0, bound = 0;           // bound: of the logarithm of the ratio
  std::complex<double> ratio;
};

/// 40 dB in both channels, 200.3 cycles.
Record record_of(std::size_t samples) {
  Record r;
  const double n = static_cast<double>(samples), sigma_v = 1 / std::sqrt(2e4), sigma_i = 0.56 * sigma_v;
  r.omega = 2 * std::numbers::pi * 200.3 / n;
  const std::complex<double> v = std::polar(1.0, 0.3), i = std::polar(0.8, -1.2);
  r.ratio = v / i;
  r.bound = std::sqrt(2 / n * (sigma_v * sigma_v + std::pow(sigma_i / 0.8, 2)));
  Random random(1);
  for (std::size_t k = 0; k < samples; ++k) {
    const std::complex<double> turn = std::polar(1.0, r.omega * (static_cast<double>(k) - (n - 1) / 2));
    r.v.push_back((v * turn).real() + 0.1 + sigma_v * random.normal());
    r.i.push_back((i * turn).real() - 0.02 + sigma_i * random.normal());
  }
  return r;
}

bool right(const Record& r, double omega, std::complex<double> ratio) {
  return std::abs(ratio / r.ratio - 1.0) < 6 * r.bound && std::fabs(omega / r.omega - 1) < 1e-3;
}

double seconds_now() {
  return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count();
}

double goal(std::size_t samples) { return samples < 100000 ? 40 : samples < 5000000 ? 1000 : 1500; }

/// False when our answer is wrong.
bool compare(std::size_t samples) {
  const Record r = record_of(samples);
  const SineChannel channels[] = {{r.v}, {r.i}};
  const auto fit = fit_sines(channels);
  if (!fit || !right(r, fit->omega, fit->channels[0].phasor / fit->channels[1].phasor)) {
    std::printf("%9zu  WRONG ANSWER\n", samples);
    return false;
  }
  const std::string file =
      (std::filesystem::temp_directory_path() / ("sine_benchmark_" + std::to_string(samples) + ".f64")).string();
  {
    std::ofstream out(file, std::ios::binary);
    for (const auto* y : {&r.v, &r.i}) {
      out.write(reinterpret_cast<const char*>(y->data()), static_cast<std::streamsize>(y->size() * sizeof(double)));
    }
  }
  const int rounds = samples < 100000 ? 7 : samples < 5000000 ? 3 : 1;
  double ours = 1e9, peer = 0, peer_busy = 0, used = 0;
  for (int round = 0; round < rounds; ++round) {
    for (int k = 0; k < 30; ++k) {
      const double began = seconds_now();
      used += fit_sines(channels)->omega;
      ours = std::min(ours, seconds_now() - began);
    }
    const std::string command = "/usr/bin/python3 tests/benchmarks/sine_peer.py '" + file + "' 2>/dev/null";
    std::FILE* pipe = popen(command.c_str(), "r");
    double seconds = 0, busy = 0, omega = 0, modulus = 0, argument = 0;
    const bool ok = pipe != nullptr &&
                    std::fscanf(pipe, "%lf %lf %lf %lf %lf", &seconds, &busy, &omega, &modulus, &argument) == 5;
    if (pipe != nullptr) pclose(pipe);
    if (!ok || !right(r, omega, std::polar(modulus, argument))) continue;
    if (peer == 0 || seconds < peer) peer = seconds;
    if (peer_busy == 0 || busy < peer_busy) peer_busy = busy;
  }
  std::filesystem::remove(file);
  std::printf("%9zu  fit %9.3f ms", samples, ours * 1e3);
  if (peer == 0) {
    std::printf("  peer: no right answer\n");
  } else {
    std::printf("  peer %9.1f ms, busy %9.1f ms  %6.0f, %6.0f times faster (goal %g: %s)\n", peer * 1e3, peer_busy * 1e3,
                peer / ours, peer_busy / ours, goal(samples),
                std::min(peer, peer_busy) / ours >= goal(samples) ? "kept" : "missed");
  }
  if (used == 12345.678) std::printf(" ");  // the work above must not be optimised away
  return true;
}

}  // namespace

int main(int argc, char** argv) {
  std::vector<std::size_t> sizes;
  for (int k = 1; k < argc; ++k) sizes.push_back(static_cast<std::size_t>(std::atoll(argv[k])));
  if (sizes.empty()) sizes = {10000, 1000000, 10000000};
  bool all_right = true;
  std::printf("best of many runs, and best of the peer's right answers by the clock and by processor time; interleaved\n");
  for (const std::size_t samples : sizes) all_right = compare(samples) && all_right;
  return all_right ? 0 : 1;
}

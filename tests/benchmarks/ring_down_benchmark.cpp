// Speed of fit_damped_sine against what a practitioner writes with SciPy (ring_down_peer.py), and of the compression
// against a plain read of the array. Both answers are checked against the truth before anything is timed; runs are
// interleaved, and ratios of one session are printed, by the clock and by processor time: on a busy machine runs wait
// for others, and the second ratio is the fairer one. Not part of any verdict: exit 1 only for a wrong answer.
//
// usage (in the source folder): ring_down_benchmark [SAMPLES...]   (default 10000 1000000 10000000)
#include <emmintrin.h>

#include <algorithm>
#include <chrono>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <ctime>
#include <filesystem>
#include <fstream>
#include <string>
#include <vector>

#include "fitting/blocks.h"
#include "fitting/damped_sine.h"
#include "tests/fitting/ringing.h"

namespace {

using namespace coilassay;
using test::Ringing;

double seconds_now() {
  return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count();
}

double busy_seconds_now() {
  return static_cast<double>(std::clock()) / CLOCKS_PER_SEC;
}

template <class Work>
double seconds_of(const Work& work) {
  const double began = seconds_now();
  work();
  return seconds_now() - began;
}

/// A plain vectorised sum: the least that reading the array can cost.
double plain_sum(const std::vector<double>& y) {
  __m128d a = _mm_setzero_pd(), b = a, c = a, d = a;
  std::size_t i = 0;
  for (; i + 8 <= y.size(); i += 8) {
    a = _mm_add_pd(a, _mm_loadu_pd(y.data() + i));
    b = _mm_add_pd(b, _mm_loadu_pd(y.data() + i + 2));
    c = _mm_add_pd(c, _mm_loadu_pd(y.data() + i + 4));
    d = _mm_add_pd(d, _mm_loadu_pd(y.data() + i + 6));
  }
  double parts[2];
  _mm_storeu_pd(parts, _mm_add_pd(_mm_add_pd(a, b), _mm_add_pd(c, d)));
  double sum = parts[0] + parts[1];
  for (; i < y.size(); ++i) sum += y[i];
  return sum;
}

struct PeerRun {
  bool ok = false;
  double seconds = 0, busy = 0, a = 0, w = 0;
};

PeerRun run_peer(const std::string& file) {
  PeerRun run;
  const std::string command = "/usr/bin/python3 tests/benchmarks/ring_down_peer.py '" + file + "' 2>/dev/null";
  std::FILE* pipe = popen(command.c_str(), "r");
  if (pipe == nullptr) return run;
  run.ok = std::fscanf(pipe, "%lf %lf %lf %lf", &run.seconds, &run.busy, &run.a, &run.w) == 4;
  pclose(pipe);
  return run;
}

bool right(const Ringing& ringing, const Eigen::VectorXd& bound, double a, double w) {
  const double true_w = std::sqrt(ringing.q());
  return std::abs(a - ringing.a) < 6 * bound[0] && std::abs(w - true_w) < 6 * bound[1] / (2 * true_w);
}

double goal(std::size_t samples) {
  return samples < 100000 ? 15 : samples < 5000000 ? 500 : 1000;
}

/// False when our answer is wrong.
bool compare(std::size_t samples, double quality) {
  const Ringing ringing = Ringing::of(quality, 40, samples);
  const std::vector<double> y = ringing.record(1);
  const Eigen::VectorXd bound = damped_sine_bound(ringing.truth(), samples, ringing.sigma);
  const auto fit = fit_damped_sine(y);
  if (!fit || !right(ringing, bound, fit->model.a, fit->model.damped_omega())) {
    std::printf("%9zu  Q %5g  WRONG ANSWER\n", samples, quality);
    return false;
  }
  const std::string file =
      (std::filesystem::temp_directory_path() / ("ring_down_benchmark_" + std::to_string(samples) + ".f64")).string();
  std::ofstream(file, std::ios::binary)
      .write(reinterpret_cast<const char*>(y.data()), static_cast<std::streamsize>(y.size() * sizeof(double)));
  const int rounds = samples < 100000 ? 7 : samples < 5000000 ? 5 : 2;
  double peer = 0, peer_busy = 0;
  double ours = 1e9, ours_busy = 1e9, compression = 1e9, reading = 1e9, used = 0;
  const double omega = ringing.omega0;
  for (int round = 0; round < rounds; ++round) {
    for (int i = 0; i < 30; ++i) {
      const double busy = busy_seconds_now();
      ours = std::min(ours, seconds_of([&] { used += fit_damped_sine(y)->model.a; }));
      ours_busy = std::min(ours_busy, busy_seconds_now() - busy);
      reading = std::min(reading, seconds_of([&] { used += plain_sum(y); }));
      compression =
          std::min(compression, seconds_of([&] { used += block_sums(y, samples / 512, 512, omega, 0.03).sum[0]; }));
    }
    const PeerRun run = run_peer(file);
    if (!run.ok || !right(ringing, bound, run.a, run.w)) continue;
    if (peer == 0 || run.seconds < peer) peer = run.seconds;
    if (peer_busy == 0 || run.busy < peer_busy) peer_busy = run.busy;
  }
  std::filesystem::remove(file);
  std::printf("%9zu  Q %5g  fit %9.3f ms  compression %8.3f ms = %4.1f reads", samples, quality, ours * 1e3,
              compression * 1e3, compression / reading);
  if (peer == 0) {
    std::printf("  peer: no right answer\n");
  } else {
    const double ratio = std::min(peer / ours, peer_busy / ours_busy);
    std::printf("  busy %8.3f ms  peer %9.1f ms, busy %9.1f ms  %6.0f, %6.0f times faster (goal %g: %s)\n",
                ours_busy * 1e3, peer * 1e3, peer_busy * 1e3, peer / ours, peer_busy / ours_busy, goal(samples),
                ratio >= goal(samples) ? "kept" : "missed");
  }
  if (used == 12345.678) std::printf(" ");  // the work above must not be optimised away
  return true;
}

}  // namespace

int main(int argc, char** argv) {
  std::vector<std::size_t> sizes;
  for (int i = 1; i < argc; ++i) sizes.push_back(static_cast<std::size_t>(std::atoll(argv[i])));
  if (sizes.empty()) sizes = {10000, 1000000, 10000000};
  bool all_right = true;
  std::printf(
      "best of many runs, and best of the peer's right answers by the clock and by processor time; interleaved\n");
  for (const std::size_t samples : sizes) {
    for (const double quality : {3.0, 10.0, 100.0, 1000.0}) all_right = compare(samples, quality) && all_right;
  }
  return all_right ? 0 : 1;
}

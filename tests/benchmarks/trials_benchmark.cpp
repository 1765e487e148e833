// Speed of propagate_by_trials against what a practitioner writes with NumPy (trials_peer.py): decay, frequency, capacitor and
// its loss resistance into L, R and Q. The answers are compared before the times; runs are interleaved. Not part of any
// verdict: exit 1 only for a wrong answer.
//
// usage (in the source folder): trials_benchmark [TRIALS]   (default 1000000)
#include <chrono>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <ctime>
#include <limits>
#include <string>

#include "fitting/propagation.h"

namespace {

using namespace coilassay;

struct Run {
  bool ok = false;
  double seconds = 0, busy = 0;
  double figures[18] = {};   // mean, u, low, high, shortest low and high of L, R, Q
};

Run ours(std::uint64_t trials) {
  const TrialInput inputs[] = {{1e-9, {ErrorLaw::Kind::normal, 0.005e-9, 0}},
                               {0.2, {ErrorLaw::Kind::rectangular, 0.1 / std::sqrt(3.0), 0}}};
  CorrelatedGroup group;
  group.mean = Eigen::Vector2d(6e4, 1.2e6);
  group.covariance = (Eigen::Matrix2d() << 45.0 * 45.0, 0.1 * 45.0 * 43.0, 0.1 * 45.0 * 43.0, 43.0 * 43.0).finished();
  const auto f = [](std::span<const double> x, std::span<double> y) {
    const double a = x[2], w = x[3], square = w * w + a * a;
    y[0] = 1 / (x[0] * square);
    y[1] = 2 * a * y[0] - x[1];
    y[2] = std::sqrt(square) * y[0] / y[1];
  };
  Run run;
  const auto began = std::chrono::steady_clock::now();
  const std::clock_t busy = std::clock();
  const TrialReport report = propagate_by_trials(inputs, group, 3, f, trials, 1, 2);
  run.busy = static_cast<double>(std::clock() - busy) / CLOCKS_PER_SEC;
  run.seconds = std::chrono::duration<double>(std::chrono::steady_clock::now() - began).count();
  int at = 0;
  for (const TrialResult& y : report.outputs) {
    for (const double v : {y.mean, y.standard_uncertainty, y.low, y.high, y.shortest_low, y.shortest_high}) run.figures[at++] = v;
  }
  run.ok = report.failed == 0;
  return run;
}

Run peer(std::uint64_t trials) {
  Run run;
  const std::string command = "/usr/bin/python3 tests/benchmarks/trials_peer.py " + std::to_string(trials);
  std::FILE* pipe = popen(command.c_str(), "r");
  if (pipe == nullptr) return run;
  int read = std::fscanf(pipe, "%lf %lf", &run.seconds, &run.busy);
  for (double& v : run.figures) read += std::fscanf(pipe, "%lf", &v);
  run.ok = pclose(pipe) == 0 && read == 20;
  return run;
}

/// Means and uncertainties within what so many trials leave open; ends of intervals in proportion.
bool agree(const Run& a, const Run& b, double trials) {
  for (int k = 0; k < 3; ++k) {
    const double* x = a.figures + 6 * k;
    const double* y = b.figures + 6 * k;
    const double step = x[1] / std::sqrt(trials);
    if (std::fabs(x[0] - y[0]) > 8 * step || std::fabs(x[1] - y[1]) > 8 * step) return false;
    // An end of a symmetric interval scatters by 2.7 such steps; where the shortest one lies is known less well than its length.
    if (std::fabs(x[2] - y[2]) > 20 * step || std::fabs(x[3] - y[3]) > 20 * step) return false;
    if (std::fabs((x[5] - x[4]) - (y[5] - y[4])) > 30 * step) return false;
  }
  return true;
}

}  // namespace

int main(int argc, char** argv) {
  const std::uint64_t trials = argc > 1 ? std::strtoull(argv[1], nullptr, 10) : 1'000'000;
  double best_ours = std::numeric_limits<double>::infinity(), best_peer = best_ours, busy_ours = best_ours, busy_peer = best_ours;
  for (int round = 0; round < 5; ++round) {
    const Run a = ours(trials), b = peer(trials);
    if (!a.ok || !b.ok) {
      std::fprintf(stderr, a.ok ? "the script did not run\n" : "trials failed\n");
      return 1;
    }
    if (!agree(a, b, static_cast<double>(trials))) {
      std::fprintf(stderr, "the answers differ\n");
      return 1;
    }
    best_ours = std::fmin(best_ours, a.seconds);
    best_peer = std::fmin(best_peer, b.seconds);
    busy_ours = std::fmin(busy_ours, a.busy);
    busy_peer = std::fmin(busy_peer, b.busy);
  }
  std::printf("%llu trials: ours %.1f ms with 2 threads, NumPy %.1f ms, ratio %.1f by the clock; processor time %.1f and %.1f ms, ratio %.1f\n",
              static_cast<unsigned long long>(trials), 1e3 * best_ours, 1e3 * best_peer, best_peer / best_ours, 1e3 * busy_ours,
              1e3 * busy_peer, busy_peer / busy_ours);
  return 0;
}

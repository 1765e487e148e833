// Speed of fit_circuit, starts included, against what a practitioner writes with SciPy (sweep_peer.py), and of the choice of the circuit
// with the causality test. Both answers are checked before anything is timed; ratios of one session, by processor time (the peer's by
// the clock where that is less). Exit 1 only for a wrong answer.
//
// usage (in the source folder): sweep_benchmark [POINTS...]   (default 201 10001)
#include <algorithm>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <ctime>
#include <filesystem>
#include <fstream>
#include <string>
#include <vector>

#include "fitting/circuit_fit.h"
#include "fitting/kramers_kronig.h"
#include "tests/support/sweep_draws.h"

namespace {

using namespace coilassay;

constexpr double kNoise = 3e-3;

/// Of the processor: other work on the machine does not count.
double seconds_now() { return static_cast<double>(std::clock()) / CLOCKS_PER_SEC; }

test::SweepTruth truth_of(int elements, int points) {
  test::SweepTruth t{.r = 0.05, .l = 22e-6, .c = 12e-12, .low_hz = 1e3, .high_hz = 3e7};
  // Without any other loss a resonance between two of a few points misleads the peer's start.
  if (elements == 3 && points < 1000) t.r = 5;
  if (elements > 3) t.g = 1 / 20e3;
  if (elements > 4) t.skin = 0.3;
  return t;
}

bool right(const test::SweepTruth& t, double l, double c) { return std::fabs(l / t.l - 1) < 0.01 && std::fabs(c / t.c - 1) < 0.01; }

double goal(int elements, int points) { return points > 1000 ? 5 : elements == 3 ? 3 : 2; }

/// Least time of one call in seconds.
template <class Work>
double least_time(int rounds, const Work& work) {
  double best = 1e9;
  for (int k = 0; k < rounds; ++k) {
    const double began = seconds_now();
    work();
    best = std::min(best, seconds_now() - began);
  }
  return best;
}

bool compare(int elements, int points) {
  Random random(1, static_cast<std::uint64_t>(elements));
  const auto truth = truth_of(elements, points);
  const auto sweep = test::make_sweep(truth, points, kNoise, random);
  const CircuitData data{.frequency_hz = sweep.f, .z = sweep.z, .u = {kNoise}};
  const CircuitFamily family{.parallel_loss = elements > 3, .skin = elements > 4};
  const auto fit = fit_circuit(data, family);
  if (!fit || !fit->usable() || !right(truth, fit->value(CircuitParameter::inductance), fit->value(CircuitParameter::capacitance))) {
    std::printf("%d elements, %d points: WRONG ANSWER\n", elements, points);
    return false;
  }
  const std::string file = (std::filesystem::temp_directory_path() / "sweep_benchmark.f64").string();
  {
    std::ofstream out(file, std::ios::binary);
    std::vector<double> all = sweep.f;
    for (const auto& z : sweep.z) all.push_back(z.real());
    for (const auto& z : sweep.z) all.push_back(z.imag());
    out.write(reinterpret_cast<const char*>(all.data()), static_cast<std::streamsize>(all.size() * sizeof(double)));
  }
  const int rounds = points > 1000 ? 10 : 200;
  double ours = 1e9, peer = 1e9, used = 0;
  for (int round = 0; round < 3; ++round) {
    ours = std::min(ours, least_time(rounds, [&] { used += fit_circuit(data, family)->chi_square; }));
    const std::string command = "/usr/bin/python3 tests/benchmarks/sweep_peer.py '" + file + "' " + std::to_string(kNoise) + " " +
                                std::to_string(elements) + " " + std::to_string(rounds / 5) + " 2>/dev/null";
    std::FILE* pipe = popen(command.c_str(), "r");
    double seconds = 0, busy = 0, chi = 0, r = 0, l = 0, c = 0;
    const bool ok = pipe != nullptr && std::fscanf(pipe, "%lf %lf %lf %lf %lf %lf", &seconds, &busy, &chi, &r, &l, &c) == 6;
    if (pipe != nullptr) pclose(pipe);
    if (ok && right(truth, l, c)) peer = std::min({peer, seconds, busy});
  }
  std::filesystem::remove(file);
  std::printf("%d elements, %5d points  fit %7.3f ms", elements, points, ours * 1e3);
  if (peer == 1e9) {
    std::printf("  peer: no right answer\n");
  } else {
    std::printf("  peer %8.2f ms  %5.1f times faster (goal %g: %s)\n", peer * 1e3, peer / ours, goal(elements, points),
                peer / ours >= goal(elements, points) ? "kept" : "missed");
  }
  if (used == 12345.678) std::printf(" ");   // the work above must not be optimised away
  return true;
}

/// Choice and causality test over broad draws: what a command does beside reading and writing.
void choose(int points) {
  double sum = 0, worst = 0;
  constexpr int kSweeps = 60;
  for (std::uint64_t d = 0; d < kSweeps; ++d) {
    Random random(d, 77);
    const auto sweep = test::make_sweep(test::draw_sweep(random, 3 + static_cast<int>(d % 3)), points, 1e-3, random);
    const CircuitData data{.frequency_hz = sweep.f, .z = sweep.z, .u = {1e-3}};
    const double seconds = least_time(2, [&] {
      const auto choice = choose_circuit(data);
      if (choice) static_cast<void>(test_kramers_kronig(data, choice->best.circuit));
    });
    sum += seconds;
    worst = std::max(worst, seconds);
  }
  std::printf("choice and causality test, %d points: mean %.1f ms, worst of %d %.1f ms (goal at 201 points 50: %s)\n", points,
              sum / kSweeps * 1e3, kSweeps, worst * 1e3, worst < 0.05 ? "kept" : "missed");
}

}  // namespace

int main(int argc, char** argv) {
  std::vector<int> sizes;
  for (int k = 1; k < argc; ++k) sizes.push_back(std::atoi(argv[k]));
  if (sizes.empty()) sizes = {201, 10001};
  bool all_right = true;
  for (const int points : sizes) {
    for (int elements = 3; elements <= 5; ++elements) all_right = compare(elements, points) && all_right;
    if (points <= 1000) choose(points);
  }
  return all_right ? 0 : 1;
}

// Time and error of the ramp against a gradient of smoothed data (ramp_peer.py), for five kinds of core at 8 bits.
// Usage, from the source folder: ramp_benchmark [seeds]
#include <unistd.h>

#include <algorithm>
#include <array>
#include <chrono>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <string>
#include <vector>

#include "acquire/synthetic/driven_ramp.h"
#include "base/random.h"
#include "fitting/roll_off_fit.h"

using namespace coilassay;

namespace {

constexpr double kOhm = 0.05;

/// Flux, blocks, fit and three currents from raw samples, as the peer has them. One family is the knee with its square term.
std::array<double, 3> ours(const std::vector<double>& v, const std::vector<double>& i, double dt, bool choice) {
  std::vector<double> flux(v.size(), 0.0);
  for (std::size_t k = 1; k < v.size(); ++k) {
    flux[k] = flux[k - 1] + dt / 2 * (v[k - 1] + v[k] - kOhm * (i[k - 1] + i[k]));
  }
  const RollOffBlocks blocks = roll_off_blocks(flux, i, 0, i.size(), 300, 0);
  RollOffKnown known;
  known.shift_sigma = 10 * dt / std::sqrt(12.0);
  known.bend = !choice;
  Result<RollOffFit> fit = fit_roll_off(blocks, known);
  if (choice) {
    known.bend = true;
    Result<RollOffFit> bend = fit_roll_off(blocks, known);
    known.straight = true;
    const Result<RollOffFit> straight = fit_roll_off(blocks, known);
    if (bend && bend->fit.stop == FitStop::converged) {
      const double u = std::sqrt(bend->fit.covariance(6, 6));
      if (!(u < 0.05 && std::fabs(bend->curve.bend) < 2 * u)) fit = std::move(bend);
    }
  }
  if (!fit) return {NAN, NAN, NAN};
  return {fit->curve.y_at_drop(0.1, 0, 16), fit->curve.y_at_drop(0.2, 0, 16), fit->curve.y_at_drop(0.3, 0, 16)};
}

template <class F>
double seconds_of(const F& f) {
  double best = 1e9;
  for (int k = 0; k < 15; ++k) {
    const auto start = std::chrono::steady_clock::now();
    f();
    best = std::min(best, std::chrono::duration<double>(std::chrono::steady_clock::now() - start).count());
  }
  return best;
}

}  // namespace

int main(int argc, char** argv) {
  const int seeds = argc > 1 ? std::atoi(argv[1]) : 20;
  const std::string file = (std::filesystem::temp_directory_path() / ("ramp-" + std::to_string(::getpid()) + ".txt")).string();
  std::printf("%-8s %28s %28s %8s %9s %9s %9s\n", "core", "ours, r.m.s. % at 10/20/30 %", "peer at its best window", "ratio",
              "one ms", "choice ms", "peer ms");
  bool good = true;
  using synthetic::CoreKind;
  for (const CoreKind kind : {CoreKind::knee, CoreKind::tanh, CoreKind::powder, CoreKind::ferrite, CoreKind::rising}) {
    constexpr std::array kWindows = {0.05, 0.1, 0.15, 0.2, 0.3};
    std::array<double, 3> own{};
    std::array<std::array<double, 3>, kWindows.size()> peer{};
    double one = 1e9, choice = 1e9, peer_seconds = 1e9;
    for (int s = 0; s < seeds; ++s) {
      synthetic::DrivenRampBench b;
      b.core.kind = kind;
      b.pretrigger_fraction = 0;
      b.seed = static_cast<std::uint64_t>(s) + 1;
      Result<synthetic::DrivenRampRecord> record = synthetic::simulate_driven_ramp(b);
      if (!record) return 1;
      // 8 bits over 12.5 V and 20 A, half a step of noise.
      std::vector<double> v = record->capture.channels[0].samples, i = record->capture.channels[1].samples;
      Random random(b.seed, 5);
      const double step_v = 12.5 / 256, step_i = 20.0 / 256, dt = record->capture.time.step_s;
      for (double& x : v) x = std::round((x + 0.5 * step_v * random.normal()) / step_v) * step_v;
      for (double& x : i) x = std::round((x + 0.5 * step_i * random.normal()) / step_i) * step_i;
      const auto add = [&](std::array<double, 3>& to, const std::array<double, 3>& found) {
        for (std::size_t d = 0; d < 3; ++d) to[d] += std::pow(found[d] / record->truth.i_sat_a[d] - 1, 2) / seeds;
      };
      add(own, ours(v, i, dt, true));
      if (s < 3) {
        one = std::min(one, seconds_of([&] { ours(v, i, dt, false); }));
        choice = std::min(choice, seconds_of([&] { ours(v, i, dt, true); }));
      }
      {
        std::ofstream out(file);
        out.precision(12);
        for (std::size_t k = 0; k < v.size(); ++k) out << v[k] << ' ' << i[k] << '\n';
      }
      for (std::size_t w = 0; w < kWindows.size(); ++w) {
        const std::string command = "/usr/bin/python3 tests/benchmarks/ramp_peer.py " + file + " " + std::to_string(dt * 1e9) +
                                    "e-9 " + std::to_string(kOhm) + " " + std::to_string(kWindows[w]);
        std::FILE* pipe = ::popen(command.c_str(), "r");
        std::array<double, 3> found{};
        double seconds = 0;
        if (pipe == nullptr || std::fscanf(pipe, "%lf %lf %lf %lf", &found[0], &found[1], &found[2], &seconds) != 4) return 1;
        ::pclose(pipe);
        add(peer[w], found);
        peer_seconds = std::min(peer_seconds, seconds);
      }
    }
    const auto sum = [](const std::array<double, 3>& a) { return a[0] + a[1] + a[2]; };
    const auto best = *std::min_element(peer.begin(), peer.end(), [&](const auto& a, const auto& b) { return sum(a) < sum(b); });
    double ratio = 1e9;
    for (std::size_t d = 0; d < 3; ++d) ratio = std::min(ratio, std::sqrt(best[d] / own[d]));
    const auto percent = [](double square) { return 100 * std::sqrt(square); };
    std::printf("%-8s %8.3f %8.3f %8.3f   %8.2f %8.2f %8.2f   %8.1f %9.3f %9.3f %9.3f\n", std::string(name(kind)).c_str(),
                percent(own[0]), percent(own[1]), percent(own[2]), percent(best[0]), percent(best[1]), percent(best[2]), ratio,
                1e3 * one, 1e3 * choice, 1e3 * peer_seconds);
    good = good && ratio >= (kind == CoreKind::knee ? 20 : 5) && peer_seconds >= 10 * one && peer_seconds >= 3 * choice;
  }
  std::filesystem::remove(file);
  std::puts(good ? "goals met: error 20 (knee) or 5 times smaller, 10 times faster with one family, 3 with the choice"
                 : "goals missed");
  return good ? 0 : 1;
}

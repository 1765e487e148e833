// Claims, at 201 points and 0.1 % noise over a broad range of coils: (a) the right family is chosen in at least 95 % of sweeps in which
// every family that lacks one of its elements has a chi-square on noise-free data at least 20 higher; (b) at most 10 in 2000 clean
// sweeps lose a point, and at most 10 in 2000 are found not causal (scale of the noise known or not). Exit 1 otherwise.
// Argument: sweeps (default 4000).
#include <atomic>
#include <cstdio>
#include <cstdlib>
#include <mutex>

#include "base/parallel.h"
#include "fitting/circuit_fit.h"
#include "fitting/kramers_kronig.h"
#include "tests/support/sweep_draws.h"

using namespace coilassay;

namespace {

bool holds(const CircuitFamily& large, const CircuitFamily& small) {
  return (large.parallel_loss || !small.parallel_loss) && (large.skin || !small.skin) && (large.relaxation || !small.relaxation);
}

}  // namespace

int main(int argc, char** argv) {
  const int sweeps = argc > 1 ? std::atoi(argv[1]) : 4000;
  std::atomic<int> decidable = 0, right = 0, larger = 0, smaller = 0, lost = 0, not_causal = 0, refused = 0;
  std::mutex lines;
  for_each_index(static_cast<std::size_t>(sweeps), 2, [&](std::size_t d) {
    Random random(d, 200);
    auto truth = test::draw_sweep(random, 5);
    CircuitFamily family;
    family.parallel_loss = d % 2 == 1;
    family.skin = d / 2 % 3 == 1;
    family.relaxation = d / 2 % 3 == 2;
    const double share = 0.01 * std::pow(50, random.uniform());
    const double corner = truth.low_hz * std::pow(std::fmin(truth.high_hz, truth.resonance_hz()) / truth.low_hz, random.uniform());
    if (!family.parallel_loss) truth.g = 0;
    if (!family.skin) truth.skin = 0;
    if (family.relaxation) truth.share = share, truth.corner_hz = corner;
    const auto sweep = test::make_sweep(truth, 201, 1e-3, random);
    CircuitData data{.frequency_hz = sweep.f, .z = sweep.z, .u = {1e-3}, .scale_known = d / 6 % 2 == 0};
    const auto choice = choose_circuit(data);
    if (!choice) {
      ++refused;
      return;
    }
    if (!choice->left_out.empty()) ++lost;
    const auto causal = test_kramers_kronig(data, choice->best.circuit);
    if (!causal || !causal->passed) ++not_causal;

    // Noise-free data by every family that does not hold the true one: the least of their chi-squares.
    CircuitData clean = data;
    clean.scale_known = true;
    for (std::size_t i = 0; i < clean.size(); ++i) clean.z[i] = impedance_of(truth, clean.frequency_hz[i]);
    CircuitFitOptions options;
    options.limits = false;
    double least = HUGE_VAL;
    for (const bool loss : {false, true}) {
      for (const int law : {0, 1, 2}) {
        CircuitFamily other;
        other.parallel_loss = loss;
        other.skin = law == 1;
        other.relaxation = law == 2;
        if (holds(other, family)) continue;
        if (const auto fit = fit_circuit(clean, other, options)) least = std::fmin(least, fit->chi_square);
      }
    }
    if (least < 20) return;
    ++decidable;
    const CircuitFamily& chosen = choice->best.circuit.family;
    if (chosen == family) ++right;
    else if (holds(chosen, family)) ++larger;
    else {
      ++smaller;
      const std::scoped_lock lock(lines);
      std::printf("sweep %zu: %s chosen for %s, lead %.1f, noise-free %.0f\n", d, name(chosen).c_str(), name(family).c_str(), choice->lead, least);
    }
  });
  const double share = 100.0 * right / decidable;
  const bool good = share >= 95 && lost * 200 <= sweeps && not_causal * 200 <= sweeps && refused == 0;
  std::printf("right in %.2f %% of %d (too large %d, wrong %d); lost a point %d, not causal %d, refused %d of %d: %s\n", share, decidable.load(),
              larger.load(), smaller.load(), lost.load(), not_causal.load(), refused.load(), sweeps, good ? "holds" : "does not hold");
  return good ? 0 : 1;
}

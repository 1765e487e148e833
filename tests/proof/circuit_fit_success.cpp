// Claim: fit_circuit finds the minimum in at least 99.9 % of sweeps over a broad range of coils (3, 4 and 5 elements, noise
// 0.1 % and 1 %, resonance inside and outside the span): chi-square at most 9 above that of the fit started at the truth, or
// of the truth itself. Exit 1 otherwise. Argument: draws for each number of elements (default 8000).
#include <atomic>
#include <cstdio>
#include <cstdlib>
#include <mutex>

#include "base/parallel.h"
#include "fitting/circuit_fit.h"
#include "tests/support/sweep_draws.h"

using namespace coilassay;

int main(int argc, char** argv) {
  const int draws = argc > 1 ? std::atoi(argv[1]) : 8000;
  std::atomic<int> missed = 0, refused = 0;
  std::mutex lines;
  for (int elements = 3; elements <= 5; ++elements) {
    CircuitFamily family;
    family.parallel_loss = elements > 3;
    family.skin = elements > 4;
    const int missed_before = missed, refused_before = refused;
    for_each_index(static_cast<std::size_t>(draws), 2, [&](std::size_t d) {
      Random random(d, static_cast<std::uint64_t>(elements));
      const auto truth = test::draw_sweep(random, elements);
      const double noise = d % 2 == 0 ? 1e-3 : 1e-2;
      const auto sweep = test::make_sweep(truth, 201, noise, random);
      const CircuitData data{.frequency_hz = sweep.f, .z = sweep.z, .u = {noise}};
      CircuitFitOptions options;
      options.limits = false;
      const auto fit = fit_circuit(data, family, options);
      Circuit start;
      start.family = family;
      start.reference_hz = truth.reference_hz();
      start.values = {truth.r, truth.l, truth.c, truth.g, truth.skin};
      double best = 0;
      for (std::size_t i = 0; i < data.size(); ++i) best += std::norm(std::log(sweep.z[i] / impedance_of(truth, sweep.f[i]))) / noise / noise;
      options.start = start;
      const auto from_truth = fit_circuit(data, family, options);
      if (from_truth) best = std::fmin(best, from_truth->chi_square);
      if (fit && fit->chi_square <= best + 9) return;
      fit ? ++missed : ++refused;
      const std::scoped_lock lock(lines);
      std::printf("%d elements, draw %zu: chi-square %.1f, from the truth %.1f%s (R %.3g L %.3g C %.3g G %.3g skin %.3g, %.3g to %.3g Hz, "
                  "resonance %.3g Hz, noise %g)\n", elements, d, fit ? fit->chi_square : -1, best, fit ? "" : ", refused", truth.r, truth.l,
                  truth.c, truth.g, truth.skin, truth.low_hz, truth.high_hz, truth.resonance_hz(), noise);
    });
    std::printf("%d elements: %d of %d found no minimum, %d refused\n", elements, missed - missed_before, draws, refused - refused_before);
  }
  const bool good = missed + refused <= 3 * draws / 1000;
  std::printf("success %.3f %%: %s\n", 100 - 100.0 * (missed + refused) / (3.0 * draws), good ? "holds" : "does not hold");
  return good ? 0 : 1;
}

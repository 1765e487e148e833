// Claim: the 95 % intervals of a swept coil cover as they say, the circuit being chosen by the program.
//
//   (a) noise only, of Z and of S, exact bench: 93 to 97 % pooled.
//   (b) accuracy (constant and wandering) and frequency drawn anew from their stated laws: at least 93 %, and the mean
//       width at most 1.5 times the shortest that covers 95 % of the errors that occurred, taken in units of u (coils differ).
// A withheld value counts as a miss unless its bound holds. R_ac counts where the coil has a skin effect
// and the program gives a law of that kind or a limit.
// Exit 1 when a limit is missed. Arguments: trials per cell (default 2000), 1 to list the misses.
#include <algorithm>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <map>
#include <string>
#include <vector>

#include "base/parallel.h"
#include "tests/support/sweep_bench.h"

namespace {

using namespace coilassay;

struct Tally {
  int tried = 0, covered = 0, withheld = 0;
  std::vector<double> errors;   // over the half-width of the interval
  double coverage() const { return static_cast<double>(covered) / std::max(tried, 1); }
  /// Mean width over the shortest common factor that would cover 95 %.
  double width_ratio() {
    if (errors.size() < 20) return 0;
    std::sort(errors.begin(), errors.end());
    return 1 / errors[static_cast<std::size_t>(0.95 * static_cast<double>(errors.size() - 1))];
  }
};
using Tallies = std::map<std::string, Tally>;

void judge(Tallies& tallies, const std::string& key, const Estimate* e, const Measurement& m, double truth, const std::string& symbol) {
  Tally& t = tallies[key];
  if (e == nullptr) {
    for (const Bound& b : m.bounds) {
      if (b.symbol != symbol) continue;
      ++t.tried;
      t.covered += truth >= b.at_least.value_or(truth) && truth <= b.at_most.value_or(truth) ? 1 : 0;
      ++t.withheld;
      return;
    }
    ++t.tried;
    ++t.withheld;
    return;
  }
  ++t.tried;
  t.covered += e->low <= truth && truth <= e->high ? 1 : 0;
  const double half = truth > e->quantity.value ? e->high - e->quantity.value : e->quantity.value - e->low;
  if (half > 0) t.errors.push_back(std::fabs(truth - e->quantity.value) / half);
}

bool list_misses = false;

void trial(Tallies& tallies, bool drawn, double noise, bool scattering, std::uint64_t seed) {
  Random random(seed, 5);
  synthetic::CoilSweepBench b = test::draw_coil(random, noise);
  b.seed = seed;
  if (scattering) {
    b.noise_ratio = 0;
    b.scattering_noise = noise;
  }
  SweepRequest request;
  request.propagation.exact_bench = true;
  const double accuracy = drawn ? 2e-3 : 0, frequency = drawn ? 50e-6 : 0;
  if (drawn) {
    request.bench.impedance.ratio = StatedValue::unstated(accuracy, Unit::one);
    request.bench.timebase = StatedValue::unstated(frequency, Unit::one);
  }
  const double at = std::sqrt(b.start_hz * b.stop_hz);
  request.at_hz = {at};
  const Sweep sweep = test::seen_with(test::draw_errors(random, accuracy, frequency, b), b);
  const Result<Measurement> result = measure_sweep(sweep, request);
  const Measurement none;
  const Measurement& m = result ? *result : none;
  const auto truth = synthetic::simulate_coil_sweep(b)->truth;
  const auto z = synthetic::coil_impedance(b, at);
  const double w = 2 * std::numbers::pi * at;
  judge(tallies, "L", m.find("L"), m, b.inductance_h, "L");
  judge(tallies, "R_dc", m.find("R_dc"), m, b.resistance_ohm, "R_dc");
  judge(tallies, "C_par", m.find("C_par"), m, b.parallel_capacitance_f, "C_par");
  const double f_r = std::isfinite(truth.f_r_hz) ? truth.f_r_hz : HUGE_VAL;
  judge(tallies, "f_r", m.find("f_r"), m, f_r, "f_r");
  const Estimate* ac = m.find("R_ac");
  const bool has_limit = std::any_of(m.bounds.begin(), m.bounds.end(), [](const Bound& each) { return each.symbol == "R_ac"; });
  if (b.skin_ohm > 0 && (ac != nullptr ? ac->definition.starts_with("skin") : has_limit)) {
    const double f_ref = m.model->parameters.at("f_ref").value;
    judge(tallies, "R_ac", ac, m, b.skin_ohm * std::sqrt(f_ref / b.skin_frequency_hz), "R_ac");
  }
  if (b.parallel_resistance_ohm > 0) judge(tallies, "R_par", m.find("R_par"), m, b.parallel_resistance_ohm, "R_par");
  const Point* point = m.points.empty() ? nullptr : &m.points.front();
  const auto apparent = [&](const char* symbol, double value) {
    const Estimate* found = nullptr;
    if (point != nullptr) {
      for (const Estimate& e : point->estimates) found = e.symbol == symbol ? &e : found;
    }
    judge(tallies, std::string(symbol) + " at", found, m, value, "none");
  };
  apparent("L_s", z.imag() / w);
  apparent("R_s", z.real());
  if (list_misses) {
    if (m.find("L") == nullptr) std::printf("no L, seed %llu noise %g: %s\n", static_cast<unsigned long long>(seed), noise, result ? (m.findings.empty() ? "?" : m.findings.back().message.c_str()) : result.error().finding.c_str());
    for (const char* symbol : {"L", "R_dc", "C_par", "f_r"}) {
      const double value = symbol[0] == 'L' ? b.inductance_h : symbol[0] == 'R' ? b.resistance_ohm : symbol[0] == 'C' ? b.parallel_capacitance_f : f_r;
      const Estimate* e = m.find(symbol);
      if (e == nullptr || (e->low <= value && value <= e->high)) continue;
      std::printf("miss %s seed %llu noise %g: %g in [%g %g], %s, skin %g R_par %g\n", symbol, static_cast<unsigned long long>(seed), noise, value, e->low, e->high,
                  m.model->name.c_str(), b.skin_ohm / b.resistance_ohm, b.parallel_resistance_ohm);
    }
  }
}

}  // namespace

int main(int argc, char** argv) {
  const int trials = argc > 1 ? std::atoi(argv[1]) : 2000;
  list_misses = argc > 2;
  struct Cell {
    bool drawn;
    double noise;
    bool scattering = false;   // the noise is one of S
  };
  const std::vector<Cell> cells = {{false, 1e-4}, {false, 1e-3}, {false, 1e-2}, {false, 1e-4, true}, {false, 1e-3, true},
                                   {true, 1e-4},  {true, 1e-3},  {true, 1e-2}};
  std::vector<Tallies> outcomes(cells.size());
  for_each_index(cells.size(), list_misses ? 1 : 2, [&](std::size_t i) {
    for (int t = 0; t < trials; ++t) trial(outcomes[i], cells[i].drawn, cells[i].noise, cells[i].scattering, static_cast<std::uint64_t>(t) + 100000 * i);
  });
  bool good = true;
  std::map<std::string, Tally> pools;
  for (std::size_t i = 0; i < cells.size(); ++i) {
    std::printf("%s noise %.2f %%%s\n", cells[i].drawn ? "(b)" : "(a)", 100 * cells[i].noise, cells[i].scattering ? " of S" : "");
    for (auto& [key, t] : outcomes[i]) {
      std::printf("  %-8s %6.2f %% of %d, withheld %d, width %.2f\n", key.c_str(), 100 * t.coverage(), t.tried, t.withheld, t.width_ratio());
      Tally& pool = pools[std::string(cells[i].drawn ? "(b) " : cells[i].scattering ? "(a) S " : "(a) ") + key];
      pool.tried += t.tried;
      pool.covered += t.covered;
      pool.errors.insert(pool.errors.end(), t.errors.begin(), t.errors.end());
    }
  }
  // A smaller run than the full one may miss the limits by chance: three standard deviations of its size.
  for (auto& [key, pool] : pools) {
    const double slack = trials < 2000 ? 3 * std::sqrt(0.05 * 0.95 / pool.tried) : 0;
    const double cover = pool.coverage(), width = pool.width_ratio();
    const bool low = cover < 0.93 - slack;
    const bool high = key.starts_with("(a)") && cover > 0.97 + slack && pool.withheld == 0;
    const bool wide = key.starts_with("(b)") && width > 1.5;
    good = good && !low && !wide;
    std::printf("pooled %-12s %6.2f %% of %d, width %.2f%s%s%s\n", key.c_str(), 100 * cover, pool.tried, width, low ? "  MISSED" : "", high ? "  wider than it needs" : "",
                wide ? "  TOO WIDE" : "");
  }
  std::printf(good ? "coverage holds\n" : "coverage does not hold\n");
  return good ? 0 : 1;
}

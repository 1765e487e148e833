// A fixture set from the captures of its standards, and what it corrects.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/fixture.h"
#include "analysis/fixture_checks.h"
#include "analysis/fixture_relation.h"
#include "analysis/interpolation.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;

constexpr std::size_t kMostPoints = 6000;   // a set is a sheet, and sheets are at most 1 MiB
constexpr double kSameFrequency = 1e-6;
constexpr double kApart = 10;               // an open is at least so many times a short
constexpr double kTouches_ohm = 5;          // a short that touches is less

std::string text(double value, Unit unit) { return to_text(value, unit, Script::utf8, 3); }

tl::unexpected<Error> refused(const Sweep& sweep, std::string finding, std::string remedy) {
  return failure(Problem::usage, sweep.source.name, std::move(finding), std::move(remedy));
}

/// Order of a sweep's points by frequency, without the bad ones and without repeats.
std::vector<std::size_t> order_of(const Sweep& sweep) {
  std::vector<std::size_t> order;
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    if (sweep.frequency_hz[i] > 0) order.push_back(i);
  }
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return sweep.frequency_hz[a] < sweep.frequency_hz[b]; });
  const auto same = [&](std::size_t a, std::size_t b) { return sweep.frequency_hz[a] == sweep.frequency_hz[b]; };
  order.erase(std::unique(order.begin(), order.end(), same), order.end());
  return order;
}

bool usable(const Sweep& sweep, std::size_t i) {
  const Complex z = sweep.z_ohm[i][0];
  return !(i < sweep.bad.size() && sweep.bad[i]) && std::isfinite(z.real()) && std::isfinite(z.imag());
}

Result<void> same_frequencies(const Sweep& a, const std::vector<std::size_t>& of_a, const Sweep& b, const std::vector<std::size_t>& of_b) {
  bool same = of_a.size() == of_b.size();
  for (std::size_t i = 0; same && i < of_a.size(); ++i) {
    same = std::fabs(a.frequency_hz[of_a[i]] / b.frequency_hz[of_b[i]] - 1) < kSameFrequency;
  }
  if (same) return {};
  return refused(b, "it has other frequencies than " + shown(a.source.name, 60) + " (" + std::to_string(of_b.size()) + " points against " +
                        std::to_string(of_a.size()) + ")",
                 "measure all standards with the same sweep settings");
}

/// Medians over the lower half of the grid, where a fixture is still itself.
double typical(const std::vector<Complex>& z, double (*of)(const Complex&)) {
  std::vector<double> values;
  for (std::size_t i = 0; i < std::max<std::size_t>(1, z.size() / 2); ++i) values.push_back(of(z[i]));
  return median(values);
}
double size(const Complex& z) { return std::abs(z); }

/// A standard that is not what it is called, before it spoils every part.
Result<void> check_contact(const FixtureSet& set, const StandardSweeps& sweeps) {
  const double open = typical(set.open.z_ohm, size), closed = typical(set.short_circuit.z_ohm, size);
  if (closed > open) {
    return refused(sweeps.open, "the open reads " + text(open, Unit::ohm) + " and the short " + text(closed, Unit::ohm) + ": they are exchanged",
                   "exchange --open and --short");
  }
  if (closed > kTouches_ohm && std::fabs(set.short_circuit.z_ohm.front().real()) > kTouches_ohm) {
    return refused(sweeps.short_circuit, "the short reads " + text(closed, Unit::ohm) + ": it does not touch, or is something else",
                   "clean the contacts and measure the short again");
  }
  if (open < kApart * closed) {
    return refused(sweeps.open, "the open reads " + text(open, Unit::ohm) + ", hardly more than the short (" + text(closed, Unit::ohm) +
                                    "): something is still in the fixture, or it is closed",
                   "take the part out and measure the open again");
  }
  if (!set.load) return {};
  const double load = typical(set.load->z_ohm, size);
  if (load > open / 3) {
    return refused(*sweeps.load, "the load reads " + text(load, Unit::ohm) + ", about as much as the open: it makes no contact",
                   "put the load in again and measure it");
  }
  if (load < 3 * closed) {
    return refused(*sweeps.load, "the load reads " + text(load, Unit::ohm) + ", about as much as the short (" + text(closed, Unit::ohm) + ")",
                   "use a load standard near the parts' own impedance, well above the short");
  }
  return {};
}

}  // namespace

Result<FixtureSet> make_fixture_set(const StandardSweeps& sweeps, FixtureSet set) {
  const std::vector<std::size_t> of_open = order_of(sweeps.open), of_short = order_of(sweeps.short_circuit);
  if (const auto same = same_frequencies(sweeps.open, of_open, sweeps.short_circuit, of_short); !same) return failure(same);
  std::vector<std::size_t> of_load;
  if (sweeps.load) {
    of_load = order_of(*sweeps.load);
    if (const auto same = same_frequencies(sweeps.open, of_open, *sweeps.load, of_load); !same) return failure(same);
  }
  const auto source_of = [](const Sweep& sweep) { return MeasuredStandard{sweep.source.name, sweep.source.sha256, {}}; };
  set.open = source_of(sweeps.open);
  set.short_circuit = source_of(sweeps.short_circuit);
  set.load.reset();
  if (sweeps.load) set.load = source_of(*sweeps.load);
  set.frequency_hz.clear();
  for (std::size_t i = 0; i < of_open.size(); ++i) {
    const bool good = usable(sweeps.open, of_open[i]) && sweeps.open.z_ohm[of_open[i]][0] != 0.0 && usable(sweeps.short_circuit, of_short[i]) &&
                      (!sweeps.load || usable(*sweeps.load, of_load[i]));
    if (!good) continue;
    set.frequency_hz.push_back(sweeps.open.frequency_hz[of_open[i]]);
    set.open.z_ohm.push_back(sweeps.open.z_ohm[of_open[i]][0]);
    set.short_circuit.z_ohm.push_back(sweeps.short_circuit.z_ohm[of_short[i]][0]);
    if (sweeps.load) set.load->z_ohm.push_back(sweeps.load->z_ohm[of_load[i]][0]);
  }
  if (set.frequency_hz.size() < 2) {
    return failure(Problem::too_few_samples, sweeps.open.source.name,
                   "the standards have " + std::to_string(set.frequency_hz.size()) + " usable frequencies in common", "sweep more frequencies");
  }
  if (set.frequency_hz.size() > kMostPoints) {
    return failure(Problem::usage, sweeps.open.source.name,
                   "a set holds at most " + std::to_string(kMostPoints) + " frequencies, and these are " + std::to_string(set.frequency_hz.size()),
                   "sweep the standards with fewer points: between them the set interpolates");
  }
  if (const auto fine = check_contact(set, sweeps); !fine) return failure(fine);
  if (const auto fine = check_kinds(set); !fine) return failure(fine);
  return set;
}

std::vector<FixtureEffect> fixture_effects(const FixtureSet& set, std::optional<double> part_h) {
  // The ends of the grid and every decade between.
  std::vector<double> at{set.frequency_hz.front()};
  for (double decade = std::pow(10.0, std::floor(std::log10(at.front())) + 1); decade < set.frequency_hz.back() * 0.999; decade *= 10) {
    if (decade > at.front() * 1.001) at.push_back(decade);
  }
  at.push_back(set.frequency_hz.back());
  std::vector<FixtureEffect> effects;
  for (const double f : at) {
    const double w = 2 * std::numbers::pi * f;
    const GridPlace place = place_in_grid(set.frequency_hz, f);
    FixtureStandards s;
    s.open = at_place(set.open.z_ohm, place);
    s.short_circuit = at_place(set.short_circuit.z_ohm, place);
    s.short_ohm = {set.short_resistance ? set.short_resistance->value : 0.0, w * set.short_inductance.value};
    const Complex series = s.short_circuit - s.short_ohm, across = 1.0 / (s.open - series);
    FixtureEffect effect{f, series.real(), series.imag() / w, across.imag() / w, across.real(), std::nan("")};
    if (part_h) {
      // What would be measured with an ideal part of this inductance in the fixture.
      const Complex seen = series + 1.0 / (across + 1.0 / Complex(0, w * *part_h));
      effect.part_share = std::fabs(seen.imag() / (w * *part_h) - 1);
    }
    effects.push_back(effect);
  }
  return effects;
}

}  // namespace coilassay

#include "analysis/fixture.h"

#include <algorithm>
#include <cmath>
#include <functional>
#include <numbers>

#include "analysis/connection.h"
#include "analysis/fixture_relation.h"
#include "analysis/interpolation.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "base/utc_time.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
namespace defaults = fixture_defaults;

constexpr double kCounts = 0.1, kRules = 0.5;    // of the value: fixture_residual as a note, as a caution
constexpr double kSpeedOfLight = 299792458;      // m/s, exact

std::string text(double value, Unit unit, int digits = 3) { return to_text(value, unit, Script::utf8, digits); }
std::string label(const FixtureSet& set) { return set.name.empty() ? "the set" : "set '" + shown(set.name, 40) + "'"; }

/// What the standards really are, as inputs with errors.
struct Inputs {
  enum Place : std::size_t { short_inductance, short_resistance, open_capacitance, load_value, load_inductance, count };
  InputError error[count];
};

Inputs inputs_of(const FixtureSet& set, const PropagationOptions& options) {
  Inputs in;
  const auto stated = [](const std::optional<StatedValue>& v, Unit unit) { return v.value_or(StatedValue::unstated(0, unit)); };
  in.error[Inputs::short_inductance] =
      input_error("short inductance", set.short_inductance, {defaults::kShortInductance_h, "±0.3 nH, as far as conventions differ"}, options);
  in.error[Inputs::short_resistance] = input_error("short resistance", stated(set.short_resistance, Unit::ohm),
                                                   {defaults::kShortResistance_ohm, "±2 mohm of its contacts"}, options);
  in.error[Inputs::open_capacitance] = input_error("open capacitance", stated(set.open_capacitance, Unit::farad),
                                                   {defaults::kOpenCapacitance_f, "±20 fF of the gap"}, options);
  if (set.load_value) {
    in.error[Inputs::load_value] =
        input_error("load standard", *set.load_value, {defaults::kLoadRatio * set.load_value->value, "±1 %"}, options);
    if (set.load_value->unit == Unit::ohm) {
      in.error[Inputs::load_inductance] = input_error("load inductance", stated(set.load_inductance, Unit::henry),
                                                      {defaults::kLoadInductance_h, "±1 nH of a small resistor"}, options);
    }
  }
  return in;
}

/// The standards at one frequency, from the grid and the inputs.
FixtureStandards standards_at(const FixtureSet& set, const GridPlace& place, double frequency_hz, const Inputs& in, bool linear) {
  const double w = 2 * std::numbers::pi * frequency_hz;
  FixtureStandards s;
  Complex admittance = 0;
  for (std::size_t k = 0; k < place.count; ++k) {
    admittance += (linear ? place.linear[k] : place.cubic[k]) / set.open.z_ohm[place.first + k];
  }
  s.open = 1.0 / admittance;
  s.short_circuit = at_place(set.short_circuit.z_ohm, place, linear);
  s.short_ohm = {in.error[Inputs::short_resistance].value, w * in.error[Inputs::short_inductance].value};
  s.open_siemens = {0, w * in.error[Inputs::open_capacitance].value};
  if (set.load) {
    s.load = at_place(set.load->z_ohm, place, linear);
    const double value = in.error[Inputs::load_value].value;
    s.load_ohm = set.load_value->unit == Unit::farad ? Complex(0, -1 / (w * value))
                                                     : Complex(value, w * in.error[Inputs::load_inductance].value);
  }
  return s;
}

/// Carries the points' relative errors from one impedance to the other.
void carry(std::vector<double>& u, std::size_t point, std::size_t points, double factor) {
  if (u.empty()) return;
  if (u.size() == 1) u.assign(points, u.front());
  u[point] *= factor;
}

/// A step of the corrections: z -> z, with what it does to errors that were there before and which ones it adds.
struct Step {
  std::function<Complex(std::size_t point, Complex z)> correct;
  std::vector<InputError> errors;
  /// The corrected value with error e at +1 u.
  std::function<Complex(std::size_t point, Complex z, std::size_t error)> shifted;
};

void apply(CorrectedSweep& c, const Step& step) {
  const std::size_t points = c.sweep.frequency_hz.size();
  std::vector<ImpedanceErrorTerm> added;
  for (const InputError& error : step.errors) {
    ImpedanceErrorTerm term{error.source, error.law, error.kind, error.common, error.basis, std::vector<Complex>(points)};
    term.law.standard_uncertainty = 1;
    added.push_back(std::move(term));
  }
  for (std::size_t i = 0; i < points; ++i) {
    const Complex before = c.sweep.z_ohm[i][0], after = step.correct(i, before);
    const Complex small = 1e-6 * before;
    const Complex slope = (step.correct(i, before + small) - after) / small;
    if (!std::isfinite(std::abs(after))) c.sweep.bad[i] = true;
    for (ImpedanceErrorTerm& term : c.knowledge.errors) term.dz_ohm[i] *= slope;
    const double factor = std::abs(slope) * std::abs(before) / std::abs(after);
    carry(c.knowledge.u_ratio, i, points, factor);
    carry(c.knowledge.u_phase, i, points, factor);
    for (std::size_t e = 0; e < added.size(); ++e) added[e].dz_ohm[i] = step.shifted(i, before, e) - after;
    c.sweep.z_ohm[i][0] = after;
  }
  for (ImpedanceErrorTerm& term : added) {
    const bool counts = std::any_of(term.dz_ohm.begin(), term.dz_ohm.end(), [](Complex d) { return std::abs(d) > 0; });
    if (counts) c.knowledge.errors.push_back(std::move(term));
  }
  // S as read belongs to the plane before.
  c.sweep.scattering.clear();
}

Result<void> check_fits(const Sweep& sweep, const FixtureSet& set, Connection connection, std::size_t port) {
  if (set.connection != connection || (connection == Connection::reflect && set.port != port)) {
    const auto words = [](Connection c, std::size_t p) {
      return c == Connection::reflect ? "reflect at port " + std::to_string(p) : std::string(name(c));
    };
    return failure(Problem::usage, "--fixture",
                   label(set) + " was made for the connection " + words(set.connection, set.port) + ", and this sweep is " + words(connection, port),
                   "use a set that was made the same way as the sweep");
  }
  const auto [low, high] = std::minmax_element(sweep.frequency_hz.begin(), sweep.frequency_hz.end());
  if (sweep.frequency_hz.empty() || covers(set.frequency_hz, *low, *high)) return {};
  return failure(Problem::usage, "--fixture",
                 label(set) + " covers " + text(set.frequency_hz.front(), Unit::hertz, 4) + " to " + text(set.frequency_hz.back(), Unit::hertz, 4) +
                     ", and the sweep goes from " + text(*low, Unit::hertz, 4) + " to " + text(*high, Unit::hertz, 4),
                 "make a set over the whole span, or sweep less of it: beyond its ends nothing is known of the fixture");
}

void judge_residual(Sweep& sweep, const std::vector<Complex>& before, const FixtureSet& set) {
  double worst = 0, at_hz = 0;
  for (std::size_t i = 0; i < before.size(); ++i) {
    if (sweep.bad[i]) continue;
    const double share = std::abs(before[i] / sweep.z_ohm[i][0] - 1.0);
    if (share > worst) {
      worst = share;
      at_hz = sweep.frequency_hz[i];
    }
  }
  if (worst < kCounts) return;
  sweep.findings.push_back({"fixture_residual", worst < kRules ? Severity::note : Severity::caution,
                            "the fixture changes the impedance by up to " + to_percent_text(worst) + " (at " + text(at_hz, Unit::hertz, 4) +
                                "); it is taken out by " + label(set) +
                                (worst < kRules ? std::string() : ", but what remains is the small difference of large numbers: use shorter leads"),
                            "Z", worst, Unit::one});
}

}  // namespace

Result<CorrectedSweep> without_fixture(CorrectedSweep c, const FixtureSet& set, Connection connection, std::size_t port,
                                       std::chrono::year_month_day today, const PropagationOptions& options) {
  if (const auto fine = check_fits(c.sweep, set, connection, port); !fine) return failure(fine);
  const Inputs in = inputs_of(set, options);
  std::vector<GridPlace> places;
  std::vector<Complex> before;
  c.sweep.bad.resize(c.sweep.frequency_hz.size());
  for (std::size_t i = 0; i < c.sweep.frequency_hz.size(); ++i) {
    places.push_back(place_in_grid(set.frequency_hz, c.sweep.frequency_hz[i]));
    before.push_back(c.sweep.z_ohm[i][0]);
  }
  const auto corrected = [&](std::size_t i, Complex z, const Inputs& with, bool linear) {
    return behind_fixture(z, standards_at(set, places[i], c.sweep.frequency_hz[i], with, linear));
  };
  std::vector<Inputs> moved;
  Step step;
  for (std::size_t e = 0; e < Inputs::count; ++e) {
    const double u = in.error[e].law.standard_uncertainty;
    if (!(u > 0)) continue;
    step.errors.push_back(in.error[e]);
    moved.push_back(in);
    moved.back().error[e].value += u;
  }
  InputError grid;
  grid.source = "grid of the fixture set";
  grid.law = {ErrorLaw::Kind::normal, 1, 0};
  grid.basis = "data";
  step.errors.push_back(grid);
  step.correct = [&](std::size_t i, Complex z) { return corrected(i, z, in, false); };
  step.shifted = [&](std::size_t i, Complex z, std::size_t e) {
    return e < moved.size() ? corrected(i, z, moved[e], false) : corrected(i, z, in, true);
  };
  apply(c, step);
  judge_residual(c.sweep, before, set);
  const std::string of = "fixture " + label(set) + " of " + to_text(set.made);
  c.knowledge.corrections.push_back({of + ", short of", set.short_inductance.value, Unit::henry});
  if (set.load_value) c.knowledge.corrections.push_back({of + ", load of", set.load_value->value, set.load_value->unit});
  if (std::chrono::sys_days(set.made) > std::chrono::sys_days(today)) {
    const auto days = (std::chrono::sys_days(set.made) - std::chrono::sys_days(today)).count();
    c.sweep.findings.push_back({"fixture_in_future", Severity::note,
                                label(set) + " was made on " + to_text(set.made) + ", and today is " + to_text(today) +
                                    ": one of the clocks is wrong, so nobody can tell whether it has expired",
                                "fixture", static_cast<double>(days), Unit::one});
  }
  if (set.expires && std::chrono::sys_days(today) > std::chrono::sys_days(*set.expires)) {
    const auto days = (std::chrono::sys_days(today) - std::chrono::sys_days(*set.expires)).count();
    c.sweep.findings.push_back({"fixture_expired", Severity::caution,
                                label(set) + " was good until " + to_text(*set.expires) + ", " + std::to_string(days) +
                                    (days == 1 ? " day" : " days") + " ago: measure open and short again",
                                "fixture", static_cast<double>(days), Unit::one});
  }
  return c;
}

Result<CorrectedSweep> without_two_port(CorrectedSweep c, const Sweep& file, const char* option, const PropagationOptions& options) {
  if (const auto fine = check_two_port(c.sweep, file, option); !fine) return failure(fine);
  std::vector<TwoPort> between;
  c.sweep.bad.resize(c.sweep.frequency_hz.size());
  for (const double f : c.sweep.frequency_hz) {
    const Result<TwoPort> t = two_port_at(file, f);
    if (!t) return failure(t);
    between.push_back(*t);
  }
  Step step;
  step.correct = [&](std::size_t i, Complex z) { return behind_two_port(z, between[i]); };
  const double u = options.exact_bench ? 0 : defaults::kTwoPortS / std::sqrt(3.0);
  for (const char* source : {"S11 of the two-port", "S21 S12 of the two-port", "S22 of the two-port"}) {
    for (int part = 0; u > 0 && part < 2; ++part) {
      step.errors.push_back({source, 0, {ErrorLaw::Kind::rectangular, u, 0}, 'B', true, "default: ±0.005 of S"});
    }
  }
  step.shifted = [&](std::size_t i, Complex z, std::size_t e) {
    const Complex by = e % 2 == 0 ? Complex(u) : Complex(0, u);
    TwoPort t = between[i];
    if (e < 2) t.s11 += by;
    // Both directions are one thing measured twice.
    if (e == 2 || e == 3) t.s21 *= 1.0 + std::numbers::sqrt2 * by / std::abs(t.s21);
    if (e > 3) t.s22 += by;
    return behind_two_port(z, t);
  };
  apply(c, step);
  c.knowledge.corrections.push_back({"two-port " + shown(file.source.name, 60) + " removed", 1, Unit::one});
  return c;
}

Result<CorrectedSweep> at_reference_plane(CorrectedSweep c, const ReferencePlane& plane, const PropagationOptions& options) {
  if (!(plane.velocity_factor > 0) || plane.velocity_factor > 1) {
    return failure(Problem::usage, "--velocity-factor", "a wave is neither faster than light nor standing", "give a ratio such as 0.66");
  }
  if (!(plane.line_ohm > 0)) return failure(Problem::usage, "--line-impedance", "a line has an impedance above zero", "give it like 50ohm");
  const bool length = plane.shift.unit == Unit::metre;
  InputError error = input_error("reference plane", plane.shift,
                                 {defaults::kLineDelayRatio * std::fabs(plane.shift.value), "±5 %"}, options);
  const double per_unit = length ? 1 / (kSpeedOfLight * plane.velocity_factor) : 1;
  const double delay = plane.shift.value * per_unit, u = error.law.standard_uncertainty * per_unit;
  const auto& frequency = c.sweep.frequency_hz;
  c.sweep.bad.resize(frequency.size());
  const auto at = [&](std::size_t i, Complex z, double by) {
    return behind_line(z, 2 * std::numbers::pi * frequency[i], by, plane.line_ohm);
  };
  Step step;
  step.correct = [&](std::size_t i, Complex z) { return at(i, z, delay); };
  step.shifted = [&](std::size_t i, Complex z, std::size_t) { return at(i, z, delay + u); };
  if (u > 0) step.errors.push_back(error);
  apply(c, step);
  c.knowledge.corrections.push_back({length ? "reference plane moved by" : "reference plane moved by a delay of", plane.shift.value, plane.shift.unit});
  return c;
}

}  // namespace coilassay

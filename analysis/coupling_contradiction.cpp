#include "analysis/coupling_contradiction.h"

#include <algorithm>
#include <cmath>
#include <string>

#include "analysis/coupling.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

/// ln of the inductance shorted over that open at one frequency, and its standard uncertainty, shared errors counted once.
std::pair<double, double> short_over_open(const CouplingSolution& s, const CouplingReading& open, const CouplingReading& shorted) {
  std::vector<double> shared(s.readings.shared.size(), 0.0);
  double variance = 0;
  const auto add = [&](const CouplingReading& r, double sign) {
    if (r.real) {
      variance += std::pow(r.u_size / r.size, 2);
      for (const auto& [error, effect] : r.shared) shared[error] += sign * effect.real();
      return std::log(r.size);
    }
    const double x = r.z.imag();
    variance += std::pow(std::hypot(r.u_size, r.u_angle * r.z.real() / x), 2);
    for (const auto& [error, effect] : r.shared) shared[error] += sign * (r.z * effect).imag() / x;
    return std::log(x / r.omega);
  };
  const double difference = add(shorted, 1) - add(open, -1);
  for (const double e : shared) variance += e * e;
  return {difference, std::sqrt(variance)};
}

}  // namespace

double short_above_open(const CouplingSolution& s) {
  using enum CouplingItem;
  constexpr double kCertain = 5;   // standard uncertainties; some dozens of points are looked at
  for (const auto& [open_item, short_item] : {std::pair{primary_open, primary_short}, std::pair{secondary_open, secondary_short}}) {
    for (const CouplingTrace& open : s.as_scattered) {
      for (const CouplingTrace& shorted : s.as_scattered) {
        if (open.item != open_item || shorted.item != short_item) continue;
        for (const CouplingReading& a : open.readings) {
          const auto b = std::find_if(shorted.readings.begin(), shorted.readings.end(),
                                      [&](const CouplingReading& r) { return std::fabs(r.omega / a.omega - 1) < 1e-3; });
          if (b == shorted.readings.end() || (a.real && b->real)) continue;   // of stated values the solution itself tells
          if ((!a.real && !(a.z.imag() > 0)) || (!b->real && !(b->z.imag() > 0))) continue;
          const auto [difference, u] = short_over_open(s, a, *b);
          if (difference > kCertain * u) return std::exp(difference);
          if (difference < -kCertain * u) break;
        }
      }
    }
  }
  return 0;
}

void withhold_coupling(Measurement& m, Withheld what) {
  for (const std::string symbol : {"L_1", "L_2", "M", "k", "n", "L_leak_1", "L_leak_2", "one_minus_k", "k_over_n", "k_times_n"}) {
    if (what == Withheld::coupled && (symbol == "L_1" || symbol == "L_2")) continue;
    std::erase_if(m.estimates, [&](const Estimate& e) { return e.symbol == symbol; });
    m.budget.erase(symbol);
    std::erase_if(m.correlations, [&](const Measurement::Correlation& c) { return c.a == symbol || c.b == symbol; });
    std::erase_if(m.bounds, [&](const Bound& b) { return b.symbol == symbol; });
    if (m.model) m.model->parameters.erase(symbol);
    for (Point& point : m.points) std::erase_if(point.estimates, [&](const Estimate& e) { return e.symbol == symbol; });
  }
  m.equivalents.clear();
  std::erase_if(m.findings, [](const Finding& f) { return f.code == "sign_unknown"; });   // of no k
}

bool judge_reciprocity(Measurement& result, const std::vector<std::vector<StatedValue>>& rows, std::pair<std::size_t, std::size_t> pair) {
  constexpr double kBeyondChance = 3.5;   // standard uncertainties
  const auto u = [](const StatedValue& v) {
    return v.law == Law::rectangular ? v.half_width / std::sqrt(3.0) : v.law == Law::normal ? v.standard_uncertainty
           : v.law == Law::exact     ? 1e-6 * std::fabs(v.value)
                                     : coupling_defaults::kValueRatio * std::fabs(v.value) / std::sqrt(3.0);
  };
  bool fine = true;
  for (std::size_t i = 0; i < rows.size(); ++i) {
    for (std::size_t j = i + 1; j < rows.size(); ++j) {
      if (i >= rows[j].size() || !std::isfinite(rows[j][i].value)) continue;
      const StatedValue &above = rows[i][j], &below = rows[j][i];
      const double difference = std::fabs(above.value - below.value);
      if (!(difference > kBeyondChance * std::hypot(u(above), u(below)))) continue;
      fine = false;
      const std::string a = std::to_string(i + 1), b = std::to_string(j + 1);
      result.findings.push_back({"not_reciprocal", Severity::refusal,
                                 "row " + a + " gives " + to_text(above.value, Unit::henry, Script::utf8, 4) + " between the windings " + a + " and " + b +
                                     ", row " + b + " gives " + to_text(below.value, Unit::henry, Script::utf8, 4) +
                                     ", and both must be the same: correct one, or leave the lower one out",
                                 "M", difference / std::fmax(std::fabs(above.value), std::fabs(below.value)), Unit::one});
      if (i == std::min(pair.first, pair.second) && j == std::max(pair.first, pair.second)) withhold_coupling(result);
    }
  }
  return fine;
}

}  // namespace coilassay

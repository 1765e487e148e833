// Coupled windings for tests: values and sweeps of known truth, made by the simulator and by drawing, not by the analysis.
#pragma once

#include <cmath>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/synthetic/coupled_windings.h"
#include "analysis/coupling.h"
#include "base/random.h"

namespace coilassay::test {

/// What ideal windings read, written down from their definitions.
inline double ideal_value(CouplingItem item, double l1, double l2, double k) {
  using enum CouplingItem;
  const double m = k * std::sqrt(l1 * l2);
  switch (item) {
    case primary_open: return l1;
    case primary_short: return l1 * (1 - k * k);
    case secondary_open: return l2;
    case secondary_short: return l2 * (1 - k * k);
    case aiding: return l1 + l2 + 2 * m;
    case opposing: return l1 + l2 - 2 * m;
    case ratio_forward: return m / l1;
    case ratio_reverse: return m / l2;
    default: return m;
  }
}

struct NamedMethod {
  const char* name;
  std::vector<CouplingItem> items;
};

inline std::vector<NamedMethod> coupling_methods() {
  using enum CouplingItem;
  return {{"open and short, primary", {primary_open, primary_short}},
          {"open and short, both", {primary_open, primary_short, secondary_open, secondary_short}},
          {"aiding and opposing", {primary_open, secondary_open, aiding, opposing}},
          {"ratios both ways", {ratio_forward, ratio_reverse}},
          {"ratio and opens", {primary_open, secondary_open, ratio_forward}},
          {"all", {primary_open, primary_short, secondary_open, secondary_short, aiding, opposing, ratio_forward, ratio_reverse}}};
}

/// Values of these items with normal errors of a relative size, as somebody would state them.
inline CouplingRequest drawn_values(const std::vector<CouplingItem>& items, double l1, double l2, double k, double noise, Random& random) {
  CouplingRequest request;
  request.propagation.exact_bench = true;
  for (const CouplingItem item : items) {
    const double truth = ideal_value(item, l1, l2, k);
    const double value = truth * (1 + noise * random.normal());
    const bool ratio = item == CouplingItem::ratio_forward || item == CouplingItem::ratio_reverse;
    request.inputs.push_back({item, CouplingValue{StatedValue::normal(value, noise * value, ratio ? Unit::one : Unit::henry), std::nullopt}});
  }
  return request;
}

/// Whether what was said about a symbol holds its truth: interval, or limits; nothing said is a miss.
inline bool holds(const Measurement& m, std::string_view symbol, double truth) {
  if (const Estimate* e = m.find(symbol)) return e->low <= truth && truth <= e->high;
  for (const Bound& b : m.bounds) {
    if (b.symbol == symbol) return (!b.at_least || *b.at_least <= truth) && (!b.at_most || truth <= *b.at_most);
  }
  return false;
}

/// Sweeps of these connections, as inputs.
inline CouplingRequest swept(const synthetic::CoupledWindings& windings, const std::vector<synthetic::Connection>& connections) {
  CouplingRequest request;
  request.propagation.exact_bench = true;
  for (const synthetic::Connection connection : connections) {
    Result<Sweep> sweep = synthetic::simulate_connection(windings, connection);
    if (!sweep) return {};
    const CouplingItem items[] = {CouplingItem::primary_open,    CouplingItem::primary_short, CouplingItem::secondary_open,
                                  CouplingItem::secondary_short, CouplingItem::aiding,        CouplingItem::opposing};
    request.inputs.push_back({items[static_cast<std::size_t>(connection)], std::move(*sweep)});
  }
  return request;
}

/// A clean pair of windings, measured in one of five ways; the code of the first caution or refusal, empty when there is none.
inline std::string clean_pair_alarm(std::uint64_t seed) {
  using enum synthetic::Connection;
  Random random(seed, 41);
  synthetic::CoupledWindings w;
  const double l1 = std::pow(10, random.uniform(-5, -3.5)), l2 = l1 * std::pow(10, random.uniform(-0.7, 0.7));
  w.coupling = {random.uniform(0.3, 0.95)};
  w.noise_ratio = std::pow(10, random.uniform(-4, -2.3));
  w.first_hz = 1e4;
  w.last_hz = 1e6;
  w.points = 31 + 10 * (seed % 4);
  w.seed = seed;
  for (std::size_t i = 0; i < 2; ++i) {
    const double l = i == 0 ? l1 : l2;
    const double omega = 6.283e5;
    w.windings[i] = {l, omega * l / std::pow(10, random.uniform(1.5, 2.5)), seed % 3 == 0 ? 0.001 * omega * l : 0, 0};
    if (seed % 2 == 0) w.windings[i].capacitance_f = 1 / (std::pow(6.283e6 * random.uniform(1.2, 4), 2) * l);
  }
  CouplingRequest request;
  switch (seed % 5) {
    case 0: request = swept(w, {primary_open, primary_short, secondary_open}); break;
    case 1: request = swept(w, {primary_open, secondary_open, aiding, opposing}); break;
    case 2: request = swept(w, {primary_open, primary_short, secondary_open, secondary_short, aiding, opposing}); break;
    case 3: {
      auto ports = synthetic::simulate_ports(w);
      if (!ports) return "simulation";
      request.ports = std::move(*ports);
      request.propagation.exact_bench = true;
      break;
    }
    default: request = drawn_values(coupling_methods().back().items, l1, l2, w.coupling[0], w.noise_ratio, random);
  }
  const auto m = measure_coupling(request);
  if (!m) return m.error().finding;
  for (const Finding& finding : m->findings) {
    if (finding.severity != Severity::note) return finding.code + ": " + finding.message;
  }
  return "";
}

}  // namespace coilassay::test

#include "analysis/coupling_accuracy.h"

#include <algorithm>
#include <cmath>
#include <iterator>

namespace coilassay {

std::optional<CouplingSolution> as_stated(const CouplingSolution& s) {
  CouplingReadings stated = s.readings;
  const WindingPair pair = s.pair_at({s.fit.parameters.data(), static_cast<std::size_t>(s.fit.parameters.size())});
  bool files = false;
  for (CouplingTrace& trace : stated.traces) {
    CouplingReading r = trace.readings[trace.readings.size() / 2];
    files = files || trace.scatter;
    for (const auto& [error, effect] : r.shared) {
      if (stated.shared[error].source.starts_with("scattering")) return std::nullopt;
    }
    if (!r.real) {
      r.real = true;
      r.size = predicted_ideal(trace.item, pair);
      // The noise is in the solution of the sweeps; here it only must not stand in the way.
      r.u_size = (trace.scatter ? 0.1 * kLeastCouplingNoise : r.u_size) * std::fabs(r.size);
      r.omega = std::nan("");
    }
    trace.scatter = false;
    trace.readings = {std::move(r)};
  }
  if (!files) return std::nullopt;
  stated.complex_read = false;
  std::vector<CouplingPrior> priors;
  std::copy_if(s.priors.begin(), s.priors.end(), std::back_inserter(priors), [](const CouplingPrior& p) { return p.unknown == kLink; });
  CouplingSolution of_stated = solve_coupling(std::move(stated), std::move(priors));
  if (!of_stated.k_determined) return std::nullopt;
  return of_stated;
}

void widen(Measurement& m, const std::string& symbol, double u) {
  const auto e = std::find_if(m.estimates.begin(), m.estimates.end(), [&](const Estimate& each) { return each.symbol == symbol; });
  if (e == m.estimates.end()) return;
  const double before = e->quantity.standard_uncertainty, value = e->quantity.value;
  if (!(before > 0) || !(u > 1.001 * before)) return;
  e->low = value - (value - e->low) * u / before;
  e->high = value + (e->high - value) * u / before;
  e->quantity.standard_uncertainty = u;
  std::vector<BudgetLine>& lines = m.budget[symbol];
  BudgetLine line;
  line.source = "accuracies over the sweeps";
  line.u = std::sqrt(u * u - before * before);
  line.common = true;
  line.basis = "stated";
  lines.push_back(line);
  for (BudgetLine& each : lines) each.share = each.u * each.u / (u * u);
  std::stable_sort(lines.begin(), lines.end(), [](const BudgetLine& a, const BudgetLine& b) { return a.share > b.share; });
}

}  // namespace coilassay

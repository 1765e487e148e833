#include "analysis/coupling_traces.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <numbers>

namespace coilassay {

namespace {

constexpr double kTwoPi = 2 * std::numbers::pi;

double shown_value(CouplingItem item, std::complex<double> z, double omega) {
  return is_ratio(item) ? std::copysign(std::abs(z), z.real()) : z.imag() / omega;
}

struct ByFrequency {
  std::map<CouplingItem, double> value;
};

/// k of one frequency from what was read there; NaN when that does not tell it.
double k_of(const std::map<CouplingItem, double>& v) {
  using enum CouplingItem;
  const auto get = [&v](CouplingItem item) {
    const auto found = v.find(item);
    return found == v.end() ? std::nan("") : found->second;
  };
  const double l1 = get(primary_open), l2 = get(secondary_open);
  const double mutual = std::isfinite(get(mutual_21)) ? get(mutual_21) : get(mutual_12);
  if (const double k = mutual / std::sqrt(l1 * l2); std::isfinite(k)) return k;
  if (const double k = std::sqrt(1 - get(primary_short) / l1); std::isfinite(k)) return k;
  if (const double k = std::sqrt(1 - get(secondary_short) / l2); std::isfinite(k)) return k;
  if (const double k = (get(aiding) - get(opposing)) / (4 * std::sqrt(l1 * l2)); std::isfinite(k)) return k;
  return std::sqrt(get(ratio_forward) * get(ratio_reverse));
}

}  // namespace

void add_coupling_traces(Measurement& result, const CouplingSolution& s) {
  const WindingPair pair = s.pair_at({s.fit.parameters.data(), static_cast<std::size_t>(s.fit.parameters.size())});
  std::map<double, std::map<CouplingItem, double>> by_frequency;
  for (const CouplingTrace& trace : s.readings.traces) {
    const Unit unit = is_ratio(trace.item) ? Unit::one : Unit::henry;
    Table table{"trace_" + std::string(name(trace.item)), {{"frequency_Hz", Unit::hertz, {}}, {"measured", unit, {}}, {"fitted", unit, {}}}};
    for (const CouplingReading& r : trace.readings) {
      if (!std::isfinite(r.omega)) continue;
      const double value = r.real ? r.size : shown_value(trace.item, r.z, r.omega);
      table.columns[0].values.push_back(r.omega / kTwoPi);
      table.columns[1].values.push_back(value);
      table.columns[2].values.push_back(shown_value(trace.item, predicted(trace.item, pair, r.omega), r.omega));
      by_frequency[r.omega][trace.item] = value;
    }
    if (table.columns[0].values.size() > 1) result.tables.push_back(std::move(table));
  }
  Table k{"trace_k", {{"frequency_Hz", Unit::hertz, {}}, {"k", Unit::one, {}}}};
  Table fit{"trace_k_fit", {{"frequency_Hz", Unit::hertz, {}}, {"k", Unit::one, {}}}};
  for (const auto& [omega, values] : by_frequency) {
    const double here = k_of(values);
    if (!std::isfinite(here)) continue;
    k.columns[0].values.push_back(omega / kTwoPi);
    k.columns[1].values.push_back(here);
    const double l1 = predicted(CouplingItem::primary_open, pair, omega).imag(), l2 = predicted(CouplingItem::secondary_open, pair, omega).imag();
    const double m = predicted(CouplingItem::mutual_21, pair, omega).imag();
    fit.columns[0].values.push_back(omega / kTwoPi);
    fit.columns[1].values.push_back(l1 * l2 > 0 ? m / std::sqrt(l1 * l2) : std::nan(""));
  }
  if (k.columns[0].values.size() > 1) {
    result.tables.push_back(std::move(k));
    result.tables.push_back(std::move(fit));
  }
  if (!by_frequency.empty() && by_frequency.size() > 1) return;
  Table inputs{"trace_inputs", {{"input", Unit::one, {}}, {"residual_u", Unit::one, {}}}};
  for (std::size_t i = 0; i < result.inputs.size(); ++i) {
    inputs.columns[0].values.push_back(static_cast<double>(i + 1));
    inputs.columns[1].values.push_back(result.inputs[i].residual_u);
  }
  result.tables.push_back(std::move(inputs));
}

}  // namespace coilassay

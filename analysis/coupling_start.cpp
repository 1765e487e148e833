#include "analysis/coupling_start.h"

#include <algorithm>
#include <complex>
#include <optional>

namespace coilassay {

namespace {

/// The value of an item at its lowest frequency, as an inductance or a signed ratio.
std::optional<double> apparent(const CouplingReadings& readings, CouplingItem item) {
  std::optional<double> found;
  double lowest = 0;
  for (const CouplingTrace& trace : readings.traces) {
    if (trace.item != item || trace.readings.empty()) continue;
    const CouplingReading& r = trace.readings.front();
    const double omega = std::isfinite(r.omega) ? r.omega : 0;
    if (found && omega >= lowest) continue;
    lowest = omega;
    if (r.real) {
      found = r.size;
    } else if (is_ratio(item)) {
      found = std::copysign(std::abs(r.z), r.z.real());
    } else {
      found = r.z.imag() / r.omega;
    }
  }
  return found;
}

}  // namespace

CouplingStart coupling_start(const CouplingReadings& readings) {
  using enum CouplingItem;
  const auto value = [&](CouplingItem item) { return apparent(readings, item); };
  const auto lo1 = value(primary_open), lo2 = value(secondary_open), ls1 = value(primary_short), ls2 = value(secondary_short);
  const auto aid = value(aiding), opp = value(opposing), fwd = value(ratio_forward), rev = value(ratio_reverse);
  auto mutual = value(mutual_21);
  if (!mutual) mutual = value(mutual_12);
  CouplingStart s;
  if (lo1 && *lo1 > 0) s.l1 = *lo1;
  if (lo2 && *lo2 > 0) s.l2 = *lo2;
  const double sum = aid && opp ? (*aid + *opp) / 2 : std::nan("");
  const double n_squared = fwd && rev && *fwd * *rev > 0 ? *rev / *fwd : std::nan("");
  const auto complete = [&](double& mine, double other, double squared_ratio, const std::optional<double>& shorted) {
    if (std::isfinite(mine)) return;
    if (sum - other > 0) mine = sum - other;
    else if (squared_ratio * other > 0) mine = squared_ratio * other;
    else if (shorted && *shorted > 0) mine = 1.5 * *shorted;
    else if (std::isfinite(sum)) mine = sum / 2;
    else if (other > 0) mine = other;
  };
  complete(s.l1, s.l2, n_squared, ls1);
  complete(s.l2, s.l1, 1 / n_squared, ls2);
  complete(s.l1, s.l2, n_squared, ls1);
  if (!(s.l1 > 0)) s.l1 = aid && *aid > 0 ? *aid / 2 : opp && *opp > 0 ? *opp : 1e-4;
  if (!(s.l2 > 0)) s.l2 = s.l1;
  const double geometric = std::sqrt(s.l1 * s.l2);
  double k = std::nan("");
  if (mutual) k = *mutual / geometric;
  else if (aid && opp) k = (*aid - *opp) / (4 * geometric);
  else if (fwd && rev && *fwd * *rev > 0) k = std::copysign(std::sqrt(*fwd * *rev), *fwd);
  else if (fwd) k = *fwd * std::sqrt(s.l1 / s.l2);
  else if (rev) k = *rev * std::sqrt(s.l2 / s.l1);
  else if (aid) k = (*aid - s.l1 - s.l2) / (2 * geometric);
  else if (opp) k = (s.l1 + s.l2 - *opp) / (2 * geometric);
  else if (ls1 && lo1) k = std::sqrt(std::clamp(1 - *ls1 / *lo1, 1e-6, 1.0));
  else if (ls2 && lo2) k = std::sqrt(std::clamp(1 - *ls2 / *lo2, 1e-6, 1.0));
  if (std::isfinite(k)) s.k = std::clamp(k, -0.9999, 0.9999);
  return s;
}

}  // namespace coilassay

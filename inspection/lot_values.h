// What the values of a lot say together, with the errors common to all units kept apart from those of each.
#pragma once

#include <cstddef>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "inspection/capability.h"
#include "inspection/verdict.h"

namespace coilassay {

/// One limit over the units that have a comparable value. SI; what needs two units is absent with one.
struct LotValues {
  std::size_t limit = 0;             // index in the sheet
  std::string quantity;
  Unit unit = Unit::one;
  std::size_t n = 0;
  double mean = 0, least = 0, most = 0;
  std::optional<double> deviation;   // standard deviation of the values as measured
  double u_own = 0;                  // root mean square of the errors that each unit has for itself
  double u_common = 0;               // root mean square of the errors that all units share
  std::optional<double> spread;      // of the parts themselves: deviation with u_own taken out; 0 when u_own explains it all
  std::optional<double> U_mean;      // half-width of the 95 % interval of the mean of these units' kind: scatter and common
  std::optional<Capability> capability;   // of the process, from the values in the order of the lot
  std::vector<RunSignal> signals;         // what shows that it is not steady
};

/// One for each limit with at least one value, in the order of the sheet.
///
/// With the values x_i = part_i + common + own_i the standard deviation holds parts and own errors: spread^2 = s^2 - u_own^2.
/// The common error shifts all alike: it is no part of s and does not shrink with n, so U_mean = sqrt((t s)^2/n +
/// (1.96 u_common)^2), t for n - 1 degrees of freedom at 95 %.
std::vector<LotValues> lot_values(std::span<const UnitVerdict> units);

}  // namespace coilassay

// What the accuracy of files allows to claim of two coupled windings.
#pragma once

#include <optional>
#include <string>

#include "analysis/coupling_solution.h"
#include "analysis/measurement.h"

namespace coilassay {

/// The solution as if each file were one stated inductance or ratio with its accuracy as an error of its own. A sweep that shows
/// resistances too tells the gains of files apart, but only if a gain is the same at both ends of it, which no instrument
/// guarantees: no quantity is claimed better than by this one. None where there is no file, or where the errors are those of S.
std::optional<CouplingSolution> as_stated(const CouplingSolution& solution);

/// Makes the standard uncertainty of a quantity at least u, its interval in proportion, with a line of its own in the budget.
void widen(Measurement& m, const std::string& symbol, double u);

}  // namespace coilassay

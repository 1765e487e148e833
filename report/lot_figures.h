// What a lot looks like.
#pragma once

#include <cstddef>
#include <optional>

#include "report/figure.h"
#include "report/lot_record.h"

namespace coilassay {

/// One limit of the sheet over all units with a value: values from the lowest to the highest with their intervals between
/// the limits; how often each value occurs; and the values in the order of the lot, with their mean and the limits of a
/// process that only scatters (inspection/capability.h). No panels when fewer than two units have a value.
Figure lot_values_figure(const LotRecord& lot, std::size_t limit);

/// How often the plan accepts a lot, against the part of it that is bad. No panels for a plan that looks at every unit.
Figure operating_figure(const LotRecord& lot);

/// The control chart of the check standard. No panels without readings.
Figure check_figure(const LotRecord& lot);

}  // namespace coilassay

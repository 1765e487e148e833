// Measurements made up for the tests of the room: one per kind of document, none of them measured.
#pragma once

#include "analysis/measurement.h"

namespace coilassay::test {

/// 47 uH and 0.35 ohm across 10 nF with everything a ring-down can carry: traces, budget, findings, cautions, advice.
Measurement made_up_ring_down();

/// Four capacitors and the line through them.
Measurement made_up_line();

/// A capture in which no ringing was found.
Measurement made_up_refusal();

/// A ramp with its curve, an interval that is not symmetric and a bound.
Measurement made_up_ramp();

/// Sine captures at two frequencies: points.
Measurement made_up_sine();

/// Names that try to break out of a terminal, a page, a script or a document.
Measurement with_hostile_names(Measurement measurement);

}  // namespace coilassay::test

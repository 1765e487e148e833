// The delay between the channels, from a capture of a resistor in place of the coil.
#pragma once

#include <optional>

#include "acquire/capture.h"
#include "analysis/measurement.h"
#include "analysis/sine.h"
#include "base/result.h"

namespace coilassay {

struct SkewRequest {
  SineRequest sine;                          // a stated skew is ignored: it is what is looked for
  StatedValue resistor;                      // in the place of the coil
  std::optional<StatedValue> inductance;     // of the resistor with its leads; absent: 0, up to 10 nH
};

/// The skew that remains when the inductances of shunt and resistor and the probe's droop are taken out:
/// skew = (arg(V/I) + arg(shunt and probe) - arg(R + j omega L))/omega, as `skew` beside f and Z. Stated with --skew
/// together with the same shunt inductance, nothing is corrected twice.
///
/// The delay is known but for whole periods; the one nearest to zero is taken. Finding `resistor_differs` when |Z| is not
/// the resistor's value within the uncertainties.
Result<Measurement> measure_skew(const Capture& capture, const SkewRequest& request);

}  // namespace coilassay

// The fitted circuit of a sweep's measurement, for whoever hands it on as a model.
#pragma once

#include <optional>
#include <vector>

#include "acquire/capture.h"
#include "analysis/measurement.h"
#include "fitting/circuit.h"

namespace coilassay {

/// The circuit behind the measurement's model, also with elements the data hardly show at their best values; nothing when
/// the measurement is no sweep, or has no L.
std::optional<Circuit> circuit_of(const Measurement& measurement);

/// What that circuit would show at the frequencies of a sweep (those above zero, in rising order), as one port with the
/// sweep's reference resistance.
Sweep swept(const Circuit& circuit, const Sweep& like);

}  // namespace coilassay

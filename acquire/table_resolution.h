// The step between the codes of a converter, found from the samples.
#pragma once

#include <span>

namespace coilassay {

/// Smallest common step on which all samples lie, or NaN when they lie on none.
///
/// A converter leaves a few hundred or thousand evenly spaced values; text adds its own rounding to them. A step that is
/// no more than the last written digit is believed only while the samples span few of them (65536): beyond, it says
/// how the number was written and nothing of the converter. Needs five different values.
double find_resolution(std::span<const double> samples);

}  // namespace coilassay

// Single points that no smooth misfit explains.
#pragma once

#include <complex>
#include <cstddef>
#include <span>
#include <vector>

namespace coilassay {

/// Standard deviation of white noise in whitened residuals of neighbours: by the median absolute deviation of their
/// differences, so that neither single points nor a smooth misfit moves it. NaN entries are skipped. Fewer than 8: NaN.
double neighbour_noise(std::span<const std::complex<double>> residuals);

/// Indices of residuals (in order of frequency; NaN is skipped) that stand out of the median of three neighbours on either
/// side by more than chance: the worst of `residuals.size()` does so in a share `false_alarms` of cases, for normal noise of
/// standard deviation `sigma` in the real and in the imaginary part.
std::vector<std::size_t> standing_out(std::span<const std::complex<double>> residuals, double sigma, double false_alarms);

}  // namespace coilassay

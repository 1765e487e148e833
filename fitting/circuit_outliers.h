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

/// What |r|^2 of the worst of n residuals with unit variance in both parts exceeds in a share `false_alarms` of cases: 2 ln(n/false_alarms)
/// when sigma is known; with a sigma from neighbour_noise of these n, wider by the law of Fisher for what that is worth (as much
/// as 0.3 n degrees of freedom).
double worst_by_chance(std::size_t n, double false_alarms, bool sigma_known);

/// Indices of residuals (in order of frequency; NaN is skipped) that stand out of the median of three neighbours on either
/// side by more than chance: the worst of `residuals.size()` does so in a share `false_alarms` of cases, for normal noise of
/// standard deviation `sigma` in the real and in the imaginary part.
std::vector<std::size_t> standing_out(std::span<const std::complex<double>> residuals, double sigma, bool sigma_known,
                                      double false_alarms);

}  // namespace coilassay

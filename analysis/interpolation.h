// Values between the frequencies of a grid.
#pragma once

#include <complex>
#include <span>

namespace coilassay {

/// Where a frequency lies in a grid: four neighbours (all, when the grid has fewer) and their weights.
struct GridPlace {
  std::size_t first = 0, count = 0;
  double cubic[4] = {0, 0, 0, 0};     // through all of them
  double linear[4] = {0, 0, 0, 0};    // between the two nearest
};

/// @param grid  rising, at least two; `frequency` inside it (or beyond its ends by rounding)
GridPlace place_in_grid(std::span<const double> grid, double frequency);

/// Weighted sum of the grid's values: at a point of the grid that point's own.
std::complex<double> at_place(std::span<const std::complex<double>> values, const GridPlace& place, bool linear = false);

/// Whether [low, high] lies inside the grid, but for a millionth.
bool covers(std::span<const double> grid, double low, double high);

}  // namespace coilassay

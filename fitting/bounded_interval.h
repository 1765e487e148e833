// Intervals of a parameter that cannot lie beyond a boundary, from how chi-square rises away from its best value.
#pragma once

#include <functional>

namespace coilassay {

/// Half-width, in standard uncertainties, of the acceptance region by which a value at `distance` standard uncertainties
/// from a boundary is kept, for a normal law and 95 %: 1.645 on the boundary, 1.960 far from it. The unified ordering by
/// likelihood ratio (Feldman and Cousins, Phys. Rev. D 57 (1998) 3873; from memory, checked by computing its coverage):
/// intervals by it are never empty, become one-sided by themselves and cover 95 % at every value.
double boundary_factor(double distance);

struct BoundedRequest {
  double best = 0;      // of chi-square without boundaries; may lie beyond them
  double u = 0;         // standard uncertainty there
  double low = 0, high = 1;         // what is possible
  double factor_two_sided = 1.96;   // of the law of the errors, far from boundaries ...
  double factor_one_sided = 1.645;  // ... and on one (95 % of the law lies below it)
};
struct BoundedInterval {
  double best = 0;              // within what is possible
  double low = 0, high = 0;
  bool at_low = false, at_high = false;   // the interval reaches the boundary: there it is none of the data's
};

/// chi_square(x): the smallest with the parameter held at x, for x within what is possible.
BoundedInterval bounded_interval(const BoundedRequest& request, const std::function<double(double)>& chi_square);

}  // namespace coilassay

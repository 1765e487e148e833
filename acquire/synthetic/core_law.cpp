#include "acquire/synthetic/core_law.h"

#include <cmath>

namespace coilassay::synthetic {

namespace {

constexpr double kFarthest = 100;   // knee currents
constexpr int kSteps = 20000, kBisections = 80;

template <class Below>
double first_current(double knee, const Below& below) {
  double low = 0;
  for (int i = 1; i <= kSteps; ++i) {
    double high = kFarthest * knee * i / kSteps;
    if (!below(high)) {
      low = high;
      continue;
    }
    for (int b = 0; b < kBisections; ++b) {
      const double middle = (low + high) / 2;
      (below(middle) ? high : low) = middle;
    }
    return high;
  }
  return std::nan("");
}

}  // namespace

std::string_view name(CoreKind kind) {
  switch (kind) {
    case CoreKind::knee: return "knee";
    case CoreKind::tanh: return "tanh";
    case CoreKind::powder: return "powder";
    case CoreKind::ferrite: return "ferrite";
    case CoreKind::rising: return "rising";
  }
  return "";
}

double CoreLaw::incremental(double current_a) const {
  const double x = std::fabs(current_a) / knee_current_a;
  const double lost = inductance_h - saturated_inductance_h;
  switch (kind) {
    case CoreKind::knee: return saturated_inductance_h + lost / (1 + std::pow(x, exponent));
    case CoreKind::tanh: {
      const double c = std::cosh(std::fmin(x, 300.0));
      return saturated_inductance_h + lost / (c * c);
    }
    case CoreKind::powder: return saturated_inductance_h + lost / (1 + x * x);
    case CoreKind::ferrite: return saturated_inductance_h + lost / (1 + std::pow(x, 12));
    case CoreKind::rising: return saturated_inductance_h + lost * (1 + x * x / 3) / (1 + std::pow(x, 8));
  }
  return inductance_h;
}

double CoreLaw::flux(double current_a) const {
  // Panels of a fortieth of the knee: Simpson's error there is below 1e-12 of the flux for every kind.
  const int panels = 2 + static_cast<int>(std::fmin(std::fabs(current_a) / knee_current_a * 400, 1e6));
  const double h = current_a / panels;
  double sum = 0;
  for (int p = 0; p < panels; ++p) {
    const double a = h * p;
    sum += incremental(a) + 4 * incremental(a + h / 2) + incremental(a + h);
  }
  return sum * h / 6;
}

double CoreLaw::current_at_drop(double drop) const {
  return first_current(knee_current_a, [&](double i) { return incremental(i) <= (1 - drop) * inductance_h; });
}

double CoreLaw::current_at_secant_drop(double drop) const {
  const double level = (1 - drop) * inductance_h;
  // A coarse look along the integral, then bisection with the whole integral.
  double flux_here = 0, low = 0;
  for (int i = 1; i <= kSteps; ++i) {
    const double high = kFarthest * knee_current_a * i / kSteps;
    const double next = flux_here + (high - low) / 6 *
                                        (incremental(low) + 4 * incremental((low + high) / 2) + incremental(high));
    if (next > level * high) {
      flux_here = next;
      low = high;
      continue;
    }
    double a = low, b = high;
    for (int k = 0; k < kBisections; ++k) {
      const double middle = (a + b) / 2;
      (flux(middle) <= level * middle ? b : a) = middle;
    }
    return b;
  }
  return std::nan("");
}

}  // namespace coilassay::synthetic

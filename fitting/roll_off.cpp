#include "fitting/roll_off.h"

#include <algorithm>
#include <array>

namespace coilassay {

namespace {

constexpr int kSearchSteps = 240;   // of a search for the first crossing; a roll-off has one knee
constexpr int kBisections = 60;
constexpr int kPanels = 48;

// Gauss-Legendre, 5 points on [-1, 1].
constexpr std::array kNode = {0.0, 0.5384693101056831, -0.5384693101056831, 0.9061798459386640, -0.9061798459386640};
constexpr std::array kWeight = {0.5688888888888889, 0.4786286704993665, 0.4786286704993665, 0.2369268850561891,
                                0.2369268850561891};

template <class F>
double gauss(double from, double to, int panels, const F& f) {
  double sum = 0;
  const double half = (to - from) / panels / 2;
  for (int p = 0; p < panels; ++p) {
    const double middle = from + half * (2 * p + 1);
    for (std::size_t i = 0; i < kNode.size(); ++i) sum += kWeight[i] * f(middle + half * kNode[i]);
  }
  return sum * half;
}

/// First place where `below` turns true on (from, to], by steps and bisection.
template <class F>
double first_place(double from, double to, const F& below) {
  double low = from;
  for (int i = 1; i <= kSearchSteps; ++i) {
    double high = from + (to - from) * i / kSearchSteps;
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

double RollOff::slope(double y) const {
  const double z = std::fabs(y) / knee;
  return start_slope * (floor_share + (1 - floor_share) / (1 + bend * z * z + (1 - bend) * std::pow(z, exponent)));
}

double RollOff::integral(double y) const {
  return gauss(0, y, kPanels, [&](double at) { return slope(at); });
}

double RollOff::work(double y) const {
  return gauss(0, y, kPanels, [&](double at) { return at * slope(at); });
}

double RollOff::y_at_drop(double drop, double from, double to) const {
  const double level = (1 - drop) * slope(from);
  return first_place(from, to, [&](double y) { return slope(y) <= level; });
}

double RollOff::y_at_secant_drop(double drop, double from, double to) const {
  const double level = (1 - drop) * slope(from);
  double low = from, x = 0;
  // Steps carry the integral along; the bisection only integrates within its step.
  for (int i = 1; i <= kSearchSteps; ++i) {
    double high = from + (to - from) * i / kSearchSteps;
    const double step = gauss(low, high, 1, [&](double y) { return slope(y); });
    if (x + step > level * (high - from)) {
      x += step;
      low = high;
      continue;
    }
    const double base = low;
    for (int b = 0; b < kBisections; ++b) {
      const double middle = (low + high) / 2;
      const double here = x + gauss(base, middle, 1, [&](double y) { return slope(y); });
      (here <= level * (middle - from) ? high : low) = middle;
    }
    return high;
  }
  return std::nan("");
}

double RollOff::largest_rise(double from, double to) const {
  double largest = 0;
  for (int i = 0; i <= kSearchSteps; ++i) largest = std::max(largest, slope(from + (to - from) * i / kSearchSteps));
  return largest / slope(from);
}

}  // namespace coilassay

#include "analysis/fixture_relation.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;

/// The series part is zo - d, where d is what the open adds to it: d² = (zo - zs)(d + zss), the root that is zo - zs without zss.
Complex behind_open_and_short(Complex zm, const FixtureStandards& s) {
  // With an open that is none the short stands across it: their parallel takes the short's place.
  const Complex zss = s.short_ohm / (1.0 - s.short_ohm * s.open_siemens);
  const Complex span = s.open - s.short_circuit;
  const Complex d = span * (1.0 + std::sqrt(1.0 + 4.0 * zss / span)) / 2.0;
  // zo - d is a small difference of large numbers where the strays are small; this is the same.
  const Complex behind_series = zm - (s.short_circuit - d * zss / (d + zss));
  // Across the part: the open's 1/d less what the open standard itself is.
  return behind_series / (1.0 - behind_series * (1.0 / d - s.open_siemens));
}

/// Cross ratio of four impedances: any linear fixture keeps it.
Complex behind_any(Complex zm, const FixtureStandards& s) {
  const Complex load = *s.load;
  const Complex measured = (zm - s.short_circuit) * (load - s.open) / ((zm - s.open) * (load - s.short_circuit));
  const Complex k = measured * (s.load_ohm - s.short_ohm) / (1.0 - s.load_ohm * s.open_siemens);
  return (s.short_ohm + k) / (1.0 + k * s.open_siemens);
}

}  // namespace

Complex behind_fixture(Complex measured, const FixtureStandards& standards) {
  return standards.load ? behind_any(measured, standards) : behind_open_and_short(measured, standards);
}

Complex behind_two_port(Complex measured, const TwoPort& t) {
  const Complex difference = (measured - t.reference_1_ohm) / (measured + t.reference_1_ohm) - t.s11;
  const Complex g = difference / (t.s21 * t.s12 + t.s22 * difference);
  return t.reference_2_ohm * (1.0 + g) / (1.0 - g);
}

Complex behind_line(Complex measured, double omega, double delay_s, double line_ohm) {
  const Complex g = (measured - line_ohm) / (measured + line_ohm) * std::polar(1.0, 2 * omega * delay_s);
  return line_ohm * (1.0 + g) / (1.0 - g);
}

}  // namespace coilassay

#include "analysis/fixture_checks.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <optional>

#include "analysis/fixture_relation.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;

constexpr double kLongLeads_h = 1e-6, kNoLeads_h = 5e-6;   // a metre of lead is 1 uH: doubtful, and impossible
constexpr double kNegative_h = 2e-9, kConjugate_h = 5e-9;   // a calibration plane a little behind the short, and none
constexpr double kSeen_ohm = 20e-3;                         // below, the floor of a meter makes any reactance
constexpr double kSeen_s = 1e-6;                            // the same of an open
constexpr double kNegative_f = 0.1e-12;                     // as little is left by a meter's own open correction
constexpr double kNoOpen_s = 1e-3;                          // 1 kohm across an empty fixture
constexpr double kMostly = 0.8;                             // of the points
constexpr double kOtherLoad = 2;                            // ratio
constexpr double kOtherAngle = std::numbers::pi / 4;

double omega(const FixtureSet& set, std::size_t i) { return 2 * std::numbers::pi * set.frequency_hz[i]; }
std::size_t lower_half(const FixtureSet& set) { return std::max<std::size_t>(2, set.frequency_hz.size() / 2); }
std::string text(double value, Unit unit) { return to_text(value, unit, Script::utf8, 3); }

tl::unexpected<Error> refused(const MeasuredStandard& standard, std::string finding, std::string remedy) {
  return failure(Problem::usage, standard.file, std::move(finding), std::move(remedy));
}

/// Series inductance of the short, from the lower half of the points at which its reactance rules. Nothing where it rules at
/// less than three: there a phase error of the meter looks the same.
std::optional<double> short_inductance(const FixtureSet& set) {
  std::vector<double> h;
  for (std::size_t i = 0; i < set.frequency_hz.size(); ++i) {
    const Complex z = set.short_circuit.z_ohm[i];
    if (std::fabs(z.imag()) > std::fmax(kSeen_ohm, std::fabs(z.real()))) h.push_back(z.imag() / omega(set, i));
  }
  if (h.size() < 3) return std::nullopt;
  h.resize(std::max<std::size_t>(3, h.size() / 2));
  return median(h);
}

Result<void> check_short(const FixtureSet& set) {
  const std::optional<double> h = short_inductance(set);
  if (!h) return {};
  if (*h > kNoLeads_h) {
    return refused(set.short_circuit, "the short has " + text(*h, Unit::henry) + " in series: no leads are that long, a coil is still in the fixture",
                   "put the short in the place of the part and measure it again");
  }
  if (*h < -kConjugate_h) {
    return refused(set.short_circuit, "the short's reactance is negative, like " + text(*h, Unit::henry) + " in series, which no short has",
                   "look whether the file has its imaginary part or angle with the sign turned, then measure the short again");
  }
  return {};
}

/// Slope of log |B| against log frequency where B is negative: -1 of a coil, +1 of a capacitance with the sign turned, 0 of a
/// meter that is a little off.
double negative_slope(const FixtureSet& set, std::size_t count) {
  double n = 0, sx = 0, sy = 0, sxx = 0, sxy = 0;
  for (std::size_t i = 0; i < count; ++i) {
    const double b = (1.0 / set.open.z_ohm[i]).imag();
    if (!(b < 0)) continue;
    const double x = std::log(omega(set, i)), y = std::log(-b);
    n += 1, sx += x, sy += y, sxx += x * x, sxy += x * y;
  }
  const double below = n * sxx - sx * sx;
  return below > 0 ? (n * sxy - sx * sy) / below : 0;
}

/// A capacitance shows at the top of the span, where its sign must be right.
Result<void> check_sign_of_open(const FixtureSet& set) {
  const std::size_t count = set.frequency_hz.size();
  std::vector<double> farad, top;
  for (std::size_t i = 0; i < count; ++i) {
    const double b = (1.0 / set.open.z_ohm[i]).imag();
    farad.push_back(b / omega(set, i));
    if (i >= count / 2) top.push_back(b);
  }
  const auto negative = std::count_if(farad.begin(), farad.end(), [](double each) { return each < 0; });
  const double c = median(farad);
  if (static_cast<double>(negative) < kMostly * static_cast<double>(count) || -median(top) < kSeen_s || c > -kNegative_f) return {};
  if (negative_slope(set, count) < 0.5) return {};
  return refused(set.open, "the open's capacitance is negative (" + text(c, Unit::farad) + "), which no open has",
                 "look whether the file has its imaginary part or angle with the sign turned, then measure the open again");
}

Result<void> check_open(const FixtureSet& set) {
  const std::size_t count = lower_half(set);
  std::vector<double> b, g, h;
  for (std::size_t i = 0; i < count; ++i) {
    const Complex y = 1.0 / set.open.z_ohm[i];
    b.push_back(y.imag());
    g.push_back(y.real());
    h.push_back((set.open.z_ohm[i] - set.short_circuit.z_ohm[i]).imag() / omega(set, i));
  }
  const double typical_b = median(b), typical_g = median(g);
  const auto negative = std::count_if(b.begin(), b.end(), [](double each) { return each < 0; });
  if (static_cast<double>(negative) >= kMostly * static_cast<double>(count) && -typical_b > kSeen_s) {
    const double slope = negative_slope(set, count);
    if (slope < -0.5 || -typical_b > kNoOpen_s) {
      return refused(set.open, "the open is inductive, like a coil of " + text(median(h), Unit::henry) + ": a part is still in the fixture",
                     "take the part out and measure the open again");
    }
  }
  if (typical_g > kNoOpen_s && typical_g > std::fabs(typical_b)) {
    return refused(set.open, "the open conducts like a resistor of " + text(1 / typical_g, Unit::ohm) + ": something is still in the fixture",
                   "take the part out and measure the open again");
  }
  return {};
}

/// "98.2 Ω", or "1.02 pF", as the stated value is written.
std::string as_stated(const std::vector<Complex>& z, const FixtureSet& set) {
  std::vector<double> real, size, farad;
  for (std::size_t i = 0; i < z.size(); ++i) {
    real.push_back(z[i].real());
    size.push_back(std::abs(z[i]));
    farad.push_back((1.0 / z[i]).imag() / omega(set, i));
  }
  const double r = median(real), all = median(size), c = median(farad);
  if (std::fabs(r) > 0.7 * all) return text(r, Unit::ohm);
  if (c > 0) return text(c, Unit::farad);
  return text(all, Unit::ohm) + " of positive reactance";
}

Result<void> check_load(const FixtureSet& set) {
  if (!set.load || !set.load_value) return {};
  const bool capacitor = set.load_value->unit == Unit::farad;
  std::vector<Complex> found;
  std::vector<double> ratio, angle;
  for (std::size_t i = 0; i < lower_half(set); ++i) {
    const double w = omega(set, i);
    FixtureStandards s;
    s.open = set.open.z_ohm[i];
    s.short_circuit = set.short_circuit.z_ohm[i];
    s.short_ohm = {set.short_resistance ? set.short_resistance->value : 0.0, w * set.short_inductance.value};
    s.open_siemens = {0, set.open_capacitance ? w * set.open_capacitance->value : 0.0};
    const Complex stated = capacitor ? Complex(0, -1 / (w * set.load_value->value))
                                     : Complex(set.load_value->value, set.load_inductance ? w * set.load_inductance->value : 0.0);
    const Complex z = behind_fixture(set.load->z_ohm[i], s), of = z / stated;
    if (!std::isfinite(std::abs(of)) || of == 0.0) continue;
    found.push_back(z);
    ratio.push_back(std::fabs(std::log(std::abs(of))));
    angle.push_back(std::fabs(std::arg(of)));
  }
  if (found.empty()) return {};
  if (median(ratio) <= std::log(kOtherLoad) && median(angle) <= kOtherAngle) return {};
  return refused(*set.load, "the load behind open and short is about " + as_stated(found, set) + ", and " +
                                text(set.load_value->value, set.load_value->unit) + " is stated",
                 "look whether this is the file of that load, and state its value with --load-standard");
}

}  // namespace

Result<void> check_kinds(const FixtureSet& set) {
  if (const auto fine = check_open(set); !fine) return fine;
  if (const auto fine = check_sign_of_open(set); !fine) return fine;
  if (const auto fine = check_short(set); !fine) return fine;
  return check_load(set);
}

std::vector<Finding> doubts_about(const FixtureSet& set) {
  const std::optional<double> h = short_inductance(set);
  if (!h || (*h <= kLongLeads_h && *h >= -kNegative_h)) return {};
  return {{"fixture_short", Severity::caution,
           *h > 0 ? "the short has " + text(*h, Unit::henry) + " in series, as a metre of lead or a small coil would: look whether it was the short"
                  : "the short reads " + text(*h, Unit::henry) + " in series, less than nothing: the calibration plane lies behind the short, or a sign is turned",
           "L_s", *h, Unit::henry}};
}

}  // namespace coilassay

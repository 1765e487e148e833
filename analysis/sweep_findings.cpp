// What a careful colleague would notice about a sweep.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/sweep_result.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kPi = std::numbers::pi;
constexpr double kDegree = kPi / 180;
constexpr double kTelling = 0.5;           // radian: from where an angle and its tangent differ by more than 2 %
constexpr double kNearShort = 2.8;         // radian: beyond, noise and resistance rule the tangent
constexpr double kDrift = 0.03;            // of ln L: more than the noise of a usable sweep
constexpr double kMostlyNotCausal = 0.2;   // of the points
constexpr double kRounding = 1e-6;         // of |Z|: what the digits of a file leave, and no analyser sees
constexpr double kNear = 0.1;              // f/f_r from which the capacitance shows: 1 % of L
constexpr double kThroughout = 0.9;        // share of the points
constexpr double kLowQ = 5;                // from where series and parallel values differ by 4 %
constexpr std::size_t kMostNamed = 6;
constexpr double kUnusable = 0.3;          // residual of the fit, relative: no circuit of these describes the sweep

std::string text(double value, Unit unit, int digits = 4) { return to_text(value, unit, Script::utf8, digits); }

/// How far angles are from what the slope of |Z| tells about them: Bode, arg Z is about (pi/2) d ln|Z|/d ln f.
double bode_misfit(const std::vector<double>& f, const std::vector<Complex>& z) {
  double sum = 0, weight = 0;
  // Slopes over a stretch, so that noise of a per cent does not rule them.
  const std::size_t stride = std::max<std::size_t>(z.size() / 25, 1);
  for (std::size_t i = 0; i + stride < z.size(); i += stride) {
    const double step = std::log(f[i + stride] / f[i]);
    if (!(step > 0)) continue;
    const double slope = std::log(std::abs(z[i + stride]) / std::abs(z[i])) / step;
    sum += std::fabs(std::arg(z[i + stride / 2]) - kPi / 2 * slope) * step;
    weight += step;
  }
  return weight > 0 ? sum / weight : 0;
}

/// The impedances as they would be if the file's angles were radians that were read as degrees.
std::vector<Complex> angles_as_radians(const SweepData& data) {
  std::vector<Complex> turned;
  const double r = data.points.reference_ohm;
  for (const Complex z : data.points.z) {
    if (!data.scattering) {
      turned.push_back(std::polar(std::abs(z), std::arg(z) / kDegree));
      continue;
    }
    const Complex s = (z - r) / (z + r);
    const Complex read = std::polar(std::abs(s), std::arg(s) / kDegree);
    turned.push_back(r * (1.0 + read) / (1.0 - read));
  }
  return turned;
}

/// Spread of what a coil without losses has constant, ln(f tan(arg S/2)), with the angles as they were read and as radians. Where |S|
/// is near one the angle alone tells the reactance, and only the largest angles tell the unit.
bool reactance_says_radians(const SweepData& data) {
  const double r = data.points.reference_ohm;
  double sums[2] = {}, squares[2] = {}, count = 0;
  for (std::size_t i = 0; i < data.points.size(); ++i) {
    const Complex z = data.points.z[i];
    const double angle = std::arg((z - r) / (z + r)), radian = angle / kDegree;
    if (radian < kTelling || radian > kNearShort) continue;
    const double of[2] = {std::log(data.points.frequency_hz[i] * std::tan(angle / 2)),
                          std::log(data.points.frequency_hz[i] * std::tan(radian / 2))};
    for (int k = 0; k < 2; ++k) {
      sums[k] += of[k];
      squares[k] += of[k] * of[k];
    }
    count += 1;
  }
  if (count < 5) return false;
  const auto spread = [&](int k) { return std::sqrt(std::fmax(squares[k] / count - std::pow(sums[k] / count, 2), 0)); };
  return spread(0) > kDrift && spread(1) < spread(0) / 3;
}

bool angles_look_like_radians(const SweepData& data, double& largest) {
  largest = 0;
  const double r = data.points.reference_ohm;
  for (const Complex z : data.points.z) {
    largest = std::fmax(largest, std::fabs(std::arg(data.scattering ? (z - r) / (z + r) : z)));
  }
  if (largest > 1.05 * kPi * kDegree) return false;   // no radian exceeds pi
  if (data.scattering && reactance_says_radians(data)) return true;
  const double as_read = bode_misfit(data.points.frequency_hz, data.points.z);
  const double otherwise = bode_misfit(data.points.frequency_hz, angles_as_radians(data));
  return as_read > 0.4 && otherwise < as_read / 3;
}

std::string frequencies(const std::vector<double>& list) {
  std::string all;
  for (std::size_t i = 0; i < list.size() && i < kMostNamed; ++i) all += (i == 0 ? "" : ", ") + text(list[i], Unit::hertz);
  if (list.size() > kMostNamed) all += " and " + std::to_string(list.size() - kMostNamed) + " more";
  return all;
}

/// One frequency within the span, or both ends of where the not causal points lie. True when the self-resonance was withheld.
bool judge_causality(Measurement& m, const SweepModel& model) {
  if (!model.causality || model.causality->passed) return false;
  const KramersKronig& test = *model.causality;
  std::vector<double> where;
  for (const std::size_t i : test.not_causal) where.push_back(model.points.frequency_hz[i]);
  std::sort(where.begin(), where.end());
  double worst = 0;
  for (const Complex r : test.residual) worst = std::fmax(worst, std::abs(r));
  if (worst < kRounding) return false;
  const std::string what = where.empty()
                               ? "the sweep as a whole is not what a passive, linear circuit can do"
                               : "no passive, linear circuit can have made the points at " + frequencies(where);
  std::string consequence;
  if (static_cast<double>(where.size()) > kMostlyNotCausal * static_cast<double>(test.index.size())) {
    // No circuit made most of this sweep: what is read off its narrowest features would be far surer than it is.
    consequence = "; the self-resonance and the limits of small losses are withheld";
    std::erase_if(m.estimates, [](const Estimate& e) { return e.symbol == "f_r"; });
    std::erase_if(m.correlations, [](const Measurement::Correlation& c) { return c.a == "f_r" || c.b == "f_r"; });
    m.budget.erase("f_r");
    m.bounds.clear();
  }
  m.findings.push_back({"not_causal", Severity::caution,
                        what + " (off by up to " + to_percent_text(worst) +
                            "): a change of range or level, a loose contact, or a coil that changed meanwhile. Sweep again; look at these points" +
                            consequence,
                        "Z", worst, Unit::one});
  return !consequence.empty();
}

void judge_misfit(Measurement& m, const SweepModel& model) {
  if (model.residual_rms > kUnusable) {
    m.findings.push_back({"model_misfit", Severity::refusal,
                          "none of the circuits describes the sweep: the best (" + name(model.fit.circuit.family) + ") is off by " +
                              to_percent_text(model.residual_rms) + " r.m.s.; is it a coil, and is it all of one coil?",
                          "Z", model.residual_rms, Unit::one});
    m.estimates.clear();
    m.bounds.clear();
    m.budget.clear();
    m.correlations.clear();
    return;
  }
  if (!model.misfit) return;
  m.findings.push_back({"model_misfit", Severity::caution,
                        "the residuals of the circuit (" + name(model.fit.circuit.family) + ") hang together, " +
                            to_percent_text(model.residual_rms) +
                            " r.m.s.: its elements are those of an approximation. Intervals were widened by what parts of the span "
                            "say apart; a fixture left uncorrected, or a core whose L changes with frequency, looks like this",
                        "L", model.residual_rms, Unit::one});
}

void judge_resistance(Measurement& m, const SweepModel& model) {
  std::vector<double> where;
  double worst = 0;
  for (std::size_t i = 0; i < model.points.size(); ++i) {
    if (!model.fit.used[i] || !model.fit.phase_used) continue;
    const Complex z = model.points.z[i];
    // What noise or a stated error of the angle can do is no finding.
    double allowed = 0;
    for (const ImpedanceErrorTerm& each : model.errors) allowed += std::pow(each.dz_ohm[i].real(), 2);
    const double u = model.points.u_phase.empty() ? (model.points.u.size() == 1 ? model.points.u[0] : model.points.u[i])
                                                  : (model.points.u_phase.size() == 1 ? model.points.u_phase[0] : model.points.u_phase[i]);
    double noise = u * model.fit.scale * model.noise * std::abs(z);
    if (model.alike == SweepErrors::reflection) {
      noise = u * model.fit.scale * model.noise * std::norm(z + model.points.reference_ohm) / (2 * model.points.reference_ohm);
    }
    if (z.real() >= -5 * std::sqrt(allowed + noise * noise)) continue;
    where.push_back(model.points.frequency_hz[i]);
    worst = std::fmin(worst, z.real());
  }
  if (where.empty()) return;
  m.findings.push_back({"negative_resistance", Severity::caution,
                        "the resistance is negative beyond any stated error at " + frequencies(where) + ", down to " + text(worst, Unit::ohm, 3) +
                            ": a coil gives no power, so the angle is wrong there (phase correction, cable, fixture)",
                        "R_s", worst, Unit::ohm});
}

void judge_resonance(Measurement& m, const SweepModel& model, const SweepData& data) {
  for (const Bound& bound : m.bounds) {
    if (bound.symbol != "f_r") continue;
    if (bound.at_least) {
      std::string guess;
      if (m.find("C_par") != nullptr) {
        const auto beyond = falling_zero_hz(model.fit.circuit, data.low_hz, 1e3 * data.high_hz);
        if (beyond) guess = "; the fitted circuit would have it near " + text(*beyond, Unit::hertz, 3) + ", where nothing was measured";
      }
      m.findings.push_back({"span_misses_resonance", Severity::note,
                            "the reactance is still positive at the highest frequency, so the self-resonance lies above " +
                                text(data.high_hz, Unit::hertz) + guess,
                            "f_r", data.high_hz, Unit::hertz});
    } else {
      m.findings.push_back({"span_misses_resonance", Severity::note,
                            "the reactance is negative from the lowest frequency on, so the self-resonance lies below " +
                                text(data.low_hz, Unit::hertz) + ": sweep lower to see the coil itself",
                            "f_r", data.low_hz, Unit::hertz});
    }
    return;
  }
  if (m.find("f_r") == nullptr && !m.has_finding("model_misfit") && m.find("L") != nullptr) {
    m.findings.push_back({"no_resonance", Severity::note,
                          "the reactance changes sign nowhere as that of a self-resonance does", "f_r", 0, Unit::hertz});
  }
}

const Estimate* find_in(const Point& point, std::string_view symbol) {
  for (const Estimate& e : point.estimates) {
    if (e.symbol == symbol) return &e;
  }
  return nullptr;
}

}  // namespace

bool worth_fitting(Measurement& m, const SweepData& data) {
  if (!data.has_phase) return true;
  double largest = 0;
  if (angles_look_like_radians(data, largest)) {
    m.findings.push_back({"angle_unit", Severity::refusal,
                          "the angles reach " + text(largest / kDegree, Unit::one, 3) +
                              "° at most, while the size of Z changes with frequency as a coil's does at angles 57 times larger: they look like radians "
                              "that were read as degrees. Correct the heading, or state the columns in the bench sheet: [file] columns",
                          "phi", largest, Unit::radian});
    return false;
  }
  std::size_t negative = 0, inductive = 0;
  std::vector<Complex> turned;
  for (const Complex z : data.points.z) {
    negative += z.real() < 0;
    inductive += z.imag() > 0;
    turned.push_back(std::conj(z));
  }
  const double count = static_cast<double>(data.points.size());
  if (static_cast<double>(negative) > kThroughout * count) {
    m.findings.push_back({"negative_resistance", Severity::refusal,
                          "the resistance is negative at " + std::to_string(negative) + " of " + std::to_string(data.points.size()) +
                              " points, as if the coil gave power: the angles have the wrong sign or are counted from the other channel, or a skew "
                              "was left in. Check which of voltage and current leads, and turn the sign round in the export",
                          "R_s", static_cast<double>(negative) / count, Unit::one});
    return false;
  }
  const double as_read = bode_misfit(data.points.frequency_hz, data.points.z);
  if (as_read > 0.8 && bode_misfit(data.points.frequency_hz, turned) < as_read / 3) {
    m.findings.push_back({"angle_unit", Severity::refusal,
                          "the reactance is negative where |Z| rises with frequency, and positive where it falls: the sign of the angles is turned "
                          "round. Turn it in the export",
                          "phi", as_read, Unit::radian});
    return false;
  }
  if (inductive == 0) {
    m.findings.push_back({"no_resonance", Severity::refusal,
                          "the reactance is positive at no point: what was measured is no inductance in this span. If it is a coil, its "
                          "self-resonance lies below " + text(data.low_hz, Unit::hertz) + ": sweep lower",
                          "L", 0, Unit::one});
    m.bounds.push_back({"f_r", Unit::hertz, std::nullopt, data.low_hz, 0.95});
    return false;
  }
  return true;
}

void judge_sweep(Measurement& m, const SweepModel& model, const SweepData& data) {
  if (!data.has_phase) {
    m.findings.push_back({"magnitude_only", Severity::note,
                          "the file has the size of Z without its angle: that the reactance is inductive below the self-resonance is taken for granted, and "
                          "losses show only where they rule |Z|, at the bottom and at the peak. Q between them is that of the fitted circuit, not a "
                          "measured one, and causality cannot be tested",
                          "phi", 0, Unit::one});
  }
  judge_misfit(m, model);
  const bool withheld = judge_causality(m, model);
  judge_resistance(m, model);
  if (!withheld) judge_resonance(m, model, data);
}

void judge_points(Measurement& m) {
  const Estimate* f_r = m.find("f_r");
  const Estimate* l = m.find("L");
  const double resonance = f_r != nullptr ? f_r->quantity.value : std::nan("");
  for (const Point& point : m.points) {
    if (point.from != "model" || l == nullptr) continue;
    const double f = *point.at_hz, x = f / resonance;
    const Estimate* apparent = find_in(point, "L_s");
    const Estimate* d = find_in(point, "D");
    if (x > kNear) {
      const std::string where = "at " + text(f, Unit::hertz) + ", " + text(x, Unit::one, 2) + " of the self-resonance, ";
      const std::string message =
          apparent != nullptr ? where + "L_s reads " + text(apparent->quantity.value, Unit::henry) + ", " +
                                    to_percent_text(apparent->quantity.value / l->quantity.value - 1) +
                                    " off L = " + text(l->quantity.value, Unit::henry) + ": the winding's capacitance does that (1/(1 - x²))"
                              : where + "the coil is a capacitor: a meter shows a negative inductance there. L = " +
                                    text(l->quantity.value, Unit::henry) + " is that of the circuit";
      m.findings.push_back({"near_resonance", Severity::note, message, "L_s", x, Unit::one});
    } else if (d != nullptr && d->low > 1 / kLowQ) {
      const double loss = d->quantity.value;
      m.findings.push_back({"low_q", Severity::note,
                            "at " + text(f, Unit::hertz) + " Q is " + text(1 / loss, Unit::one, 2) +
                                ": series and parallel inductance differ by " + to_percent_text(loss * loss) +
                                "; say which of L_s and L_p a limit means",
                            "Q", 1 / loss, Unit::one});
    }
  }
}

}  // namespace coilassay

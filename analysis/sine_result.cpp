#include "analysis/sine_result.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <string>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

constexpr double kLowQ = 5;              // below: L_s and L_p differ by more than 4 %
constexpr double kSkewCounts = 0.1;      // of R_s
constexpr double kShuntCounts = 0.02;    // of R_s
constexpr double kShuntRules = 0.2;
constexpr double kDroopCounts = 0.01;    // rad
constexpr double kTurnedRound = 0.35;    // rad short of -180 degrees to +90: beyond chance and any coil

std::string text(double value, Unit unit, int digits = 3) { return to_text(value, unit, Script::utf8, digits); }

double time_uncertainty(const SineRecord& sine) {
  const DrivenRecord::Errors& e = sine.record.errors;
  return std::hypot(e.skew.law.standard_uncertainty, e.shunt_tau.law.standard_uncertainty);
}

/// Standard uncertainty that budget lines of this name leave in a quantity.
double contribution(const Measurement& m, const std::string& symbol, std::string_view source) {
  const auto lines = m.budget.find(symbol);
  if (lines == m.budget.end()) return 0;
  for (const BudgetLine& line : lines->second) {
    if (line.source == source) return line.u;
  }
  return 0;
}

void withhold(Measurement& m, const std::string& symbol) {
  std::erase_if(m.estimates, [&](const Estimate& e) { return e.symbol == symbol; });
  m.budget.erase(symbol);
  std::erase_if(m.correlations, [&](const Measurement::Correlation& c) { return c.a == symbol || c.b == symbol; });
}

/// The value gives way to its upper limit.
void withhold_to_most(Measurement& m, const std::string& symbol) {
  const Estimate* estimate = m.find(symbol);
  if (estimate == nullptr) return;
  const Bound bound{symbol, estimate->quantity.unit, std::nullopt, estimate->high, 0.95};
  withhold(m, symbol);
  if (*bound.at_most > 0) m.bounds.push_back(bound);
}

bool by_default(const Measurement& m, const std::string& symbol) {
  const auto lines = m.budget.find(symbol);
  return lines != m.budget.end() && !lines->second.empty() && lines->second.front().basis.starts_with("default");
}

/// Columns the wrong way round show as a capacitance or as a source.
void judge_signs(Measurement& m) {
  const Estimate* x = m.find("X_s");
  const Estimate* r = m.find("R_s");
  if (x == nullptr || r == nullptr || !(x->high < 0)) return;
  const double phase = std::atan2(x->quantity.value, r->quantity.value);
  std::string why = "the current leads the voltage: this is no inductance at this frequency. Above its self-resonance a "
                    "coil looks like this; if the frequency is well below, voltage and current are swapped "
                    "(exchange --voltage and --current)";
  if (phase < -std::numbers::pi / 2 - kTurnedRound && r->high < 0) {
    why = "the current is counted against the voltage: turn one probe or clip round, or give its gain as a negative number";
  }
  m.findings.push_back({"channels_suspect", Severity::caution, why + "; L_s and L_p are withheld", "X_s", phase, Unit::radian});
}

void judge_skew(Measurement& m, const SineRecord& sine, double omega) {
  const Estimate* r = m.find("R_s");
  const Estimate* x = m.find("X_s");
  if (r == nullptr || x == nullptr) return;
  const double in_r = std::hypot(contribution(m, "R_s", "skew"), contribution(m, "R_s", "shunt inductance"));
  const double share = in_r / std::fmax(std::fabs(r->quantity.value), 1e-300);
  if (share < kSkewCounts) return;
  const double u_time = time_uncertainty(sine);
  const double ceiling = q_ceiling(omega, u_time);
  const bool unstated = sine.record.errors.skew.basis.starts_with("default");
  m.findings.push_back({"skew_limited", Severity::caution,
                        "the time between the channels is known to " + text(u_time, Unit::second, 2) +
                            ", which leaves R_s good to 10 % only up to Q " + text(ceiling, Unit::one, 2) + " at " +
                            text(omega / (2 * std::numbers::pi), Unit::hertz, 4) + "; here it makes " +
                            to_percent_text(share) + " of R_s" +
                            (unstated ? ". Measure the skew once with sine --of-resistor and state it with --skew"
                                      : ". Measure the skew better with sine --of-resistor, use a lower frequency, or a "
                                        "ring-down"),
                        "R_s", ceiling, Unit::one});
}

void judge_resistance(Measurement& m) {
  const Estimate* found = m.find("R_s");
  if (found == nullptr) return;
  const Estimate r = *found;
  const double value = r.quantity.value, u = r.quantity.standard_uncertainty;
  const std::string ruling = m.budget["R_s"].empty() ? "noise" : m.budget["R_s"].front().source;
  if (value < -u) {
    m.findings.push_back({"negative_resistance", Severity::caution,
                          "the phase is " + text(std::atan2(-value, std::fabs(m.find("X_s")->quantity.value)) * 1e3, Unit::one, 3) +
                              " mrad beyond 90°, as if the coil gave power: a coil cannot, so the time between the "
                              "channels is off by more than was stated, or the current is shown too late (skew) or "
                              "a shunt's inductance is missing",
                          "R_s", value, Unit::ohm});
  }
  if (value > u || r.high <= 0) return;
  const bool unstated = by_default(m, "R_s");
  m.findings.push_back({"resistance_unresolved", unstated ? Severity::note : Severity::caution,
                        "the uncertainty of R_s exceeds its value (most of it comes from: " + ruling + "): it is at most " +
                            text(r.high, Unit::ohm),
                        "R_s", u / std::fmax(std::fabs(value), 1e-300), Unit::one});
  for (const char* symbol : {"R_s", "D", "P"}) withhold_to_most(m, symbol);
}

void judge_quality(Measurement& m) {
  const Estimate* d = m.find("D");
  if (d == nullptr || !(d->low > 1 / kLowQ)) return;
  const double loss = d->quantity.value;
  m.findings.push_back({"low_q", Severity::note,
                        "with Q " + text(1 / loss, Unit::one, 2) + " series and parallel inductance differ by " +
                            to_percent_text(loss * loss) + ": say which of L_s and L_p a limit means",
                        "Q", 1 / loss, Unit::one});
}

void judge_shunt(Measurement& m, const SineRequest& request) {
  const std::optional<StatedValue>& shunt = request.bench.current.shunt;
  if (!shunt || request.bench.voltage.low_column || request.turns_ratio) return;
  const Estimate* r = m.find("R_s");
  if (r == nullptr || !(r->quantity.value > 0)) return;
  const double share = shunt->value / r->quantity.value;
  if (share < kShuntCounts) return;
  // The winding's own resistance tells: what is above it by just the shunt is the shunt.
  const std::optional<StatedValue>& dcr = request.bench.winding_resistance;
  const double u = r->quantity.standard_uncertainty;
  const bool shown_by_dcr = dcr && std::fabs(r->quantity.value - dcr->value - shunt->value) < 2 * u + 0.05 * shunt->value &&
                            shunt->value > 4 * u;
  const bool most_of_it = std::fabs(share - 1) < kShuntRules && !dcr;
  if (!shown_by_dcr && !most_of_it && share < kShuntRules) {
    // Small beside R_s and nothing shows it: that it could be is in the advice.
    m.advice.push_back("if the voltage was taken across coil and shunt together, R_s holds the shunt's " +
                       text(shunt->value, Unit::ohm) + ": subtract it with --voltage-low");
    return;
  }
  const std::string shows = shown_by_dcr ? "R_s exceeds the stated winding resistance by just the shunt's " + text(shunt->value, Unit::ohm)
                            : most_of_it ? "R_s is nearly the shunt's own " + text(shunt->value, Unit::ohm)
                                         : "the shunt's " + text(shunt->value, Unit::ohm) + " is " + to_percent_text(share) + " of R_s";
  m.findings.push_back({"shunt_drop_included", shown_by_dcr || most_of_it ? Severity::caution : Severity::note,
                        shows + ": if the voltage was taken across coil and shunt together, subtract the shunt's with "
                                "--voltage-low",
                        "R_s", share, Unit::one});
}

void judge_probe(Measurement& m, const SineRecord& sine, double omega) {
  const double corner = sine.record.probe_corner_hz;
  if (!(corner > 0)) return;
  const double phase = std::atan(2 * std::numbers::pi * corner / omega);
  if (phase < kDroopCounts) return;
  const double share = contribution(m, "R_s", "current probe corner");
  const Estimate* r = m.find("R_s");
  const bool rules = r != nullptr && share > kSkewCounts * std::fabs(r->quantity.value);
  m.findings.push_back({"probe_droop", rules ? Severity::caution : Severity::note,
                        "at this frequency the current probe's low corner turns the phase by " +
                            text(phase * 1e3, Unit::one, 3) + " mrad; it is taken out, with the tolerance of the corner" +
                            (rules ? ", which makes " + to_percent_text(share / std::fabs(r->quantity.value)) +
                                         " of R_s: use a shunt, or a probe with a lower corner"
                                   : std::string()),
                        "phi", phase, Unit::radian});
}

}  // namespace

double q_ceiling(double omega, double u_time_s) { return 0.1 / (omega * u_time_s); }

void judge_impedance(Measurement& m, const SineRecord& sine, const SineInputs& inputs, const SineRequest& request) {
  const double omega = inputs.draw(inputs.best()).omega;
  judge_signs(m);
  judge_probe(m, sine, omega);
  judge_skew(m, sine, omega);
  judge_shunt(m, request);
  judge_quality(m);
  judge_resistance(m);
}

ModelSummary model_of(const SineRecord& sine, const SineInputs& inputs) {
  ModelSummary model;
  model.name = "common sine";
  const SineFit& fit = *sine.fit;
  const auto& v = fit.channels[0];
  const auto& i = fit.channels[1];
  const auto u_of = [&](std::size_t c) {
    return std::sqrt(fit.fit.covariance.diagonal().segment<2>(static_cast<Eigen::Index>(1 + 3 * c)).maxCoeff());
  };
  model.parameters["voltage_amplitude"] = {std::abs(v.phasor), u_of(0), Unit::volt};
  model.parameters["current_amplitude"] = {std::abs(i.phasor), u_of(1), Unit::ampere};
  model.parameters["voltage_offset"] = {v.offset, std::nan(""), Unit::volt};
  model.parameters["current_offset"] = {i.offset, std::nan(""), Unit::ampere};
  for (std::size_t h = 0; h < 4; ++h) {
    const std::string order = std::to_string(h + 2);
    model.parameters["voltage_harmonic_" + order] = {std::abs(v.harmonics[h]), v.harmonic_u, Unit::volt};
    model.parameters["current_harmonic_" + order] = {std::abs(i.harmonics[h]), i.harmonic_u, Unit::ampere};
  }
  const double u_time = time_uncertainty(sine);
  if (u_time > 0) {
    model.parameters["q_ceiling"] = {q_ceiling(inputs.draw(inputs.best()).omega, u_time), std::nan(""), Unit::one};
  }
  const DrivenRecord& r = sine.record;
  model.window_s = {r.start_s + static_cast<double>(sine.first) * r.step_s,
                    r.start_s + static_cast<double>(sine.end - 1) * r.step_s};
  model.residual_rms = v.sigma_per_sample;
  model.reduced_chi_square = fit.fit.reduced_chi_square;
  model.converged = true;
  return model;
}

}  // namespace coilassay

#include "tests/report/made_up.h"

#include <cmath>
#include <numbers>

namespace coilassay::test {

namespace {

Estimate estimate(std::string symbol, double value, double u, Unit unit, double k = 1.96) {
  Estimate e;
  e.symbol = std::move(symbol);
  e.quantity = {value, u, unit};
  e.k = k;
  e.low = value - k * u;
  e.high = value + k * u;
  return e;
}

constexpr double kL = 47e-6, kR = 0.35, kC = 10.013e-9;

void add_traces(Measurement& m) {
  Table capture{"trace_capture", {{"time_s", Unit::second, {}}, {"voltage_V", Unit::volt, {}}}};
  Table fit{"trace_fit",
            {{"time_s", Unit::second, {}},
             {"fit_V", Unit::volt, {}},
             {"envelope_high_V", Unit::volt, {}},
             {"envelope_low_V", Unit::volt, {}}}};
  Table residual{"trace_residual", {{"time_s", Unit::second, {}}, {"residual_V", Unit::volt, {}}}};
  const double alpha = kR / (2 * kL), omega = std::sqrt(1 / (kL * kC) - alpha * alpha);
  for (int i = -400; i < 4000; ++i) {
    const double t = i * 1e-7;
    const double noise =
        0.02 * std::sin(12.9898 * i) * std::cos(78.233 * i * i);  // looks random, is the same everywhere
    const double envelope = 4.6 * std::exp(-alpha * t);
    const double v = i < 0 ? 0 : envelope * std::cos(omega * t);
    capture.columns[0].values.push_back(t);
    capture.columns[1].values.push_back(v + noise);
    if (i < 4) continue;
    fit.columns[0].values.push_back(t);
    fit.columns[1].values.push_back(v);
    fit.columns[2].values.push_back(envelope);
    fit.columns[3].values.push_back(-envelope);
    residual.columns[0].values.push_back(t);
    residual.columns[1].values.push_back(noise);
  }
  m.tables = {capture, fit, residual};
}

}  // namespace

Measurement made_up_ring_down() {
  Measurement m;
  m.test = "ringdown";
  SourceRecord source;
  source.source = {"ring.csv", std::string(64, 'a'), 400000, ""};
  source.samples = 20000;
  source.sample_interval_s = 2e-8;
  m.sources = {source};
  m.conditions.frequency_hz = 232000.0;
  m.conditions.peak_current_a = 0.0729;
  m.equipment = {{"C-10n", "SBW-114", "2026-05-01", "2027-05-01"}};
  m.corrections = {{"probe capacitance", 1.3e-11, Unit::farad}};
  m.estimates = {estimate("f_0", 232021.4, 3.1, Unit::hertz), estimate("alpha", 3723.0, 12.0, Unit::per_second),
                 estimate("Q", 195.8, 0.7, Unit::one), estimate("L_s", 4.70e-5, 2.71e-7, Unit::henry, 1.65),
                 estimate("R_s", 0.3500, 0.0031, Unit::ohm)};
  m.estimates[3].at_hz = 232000.0;
  m.bounds = {{"f_r", Unit::hertz, 1e7, std::nullopt, 0.95}};
  m.correlations = {{"L_s", "R_s", 0.31}};
  m.budget["L_s"] = {{"fit", 'A', 2.7e-8, 0.008, false, "data"},
                     {"capacitor", 'B', 2.70e-7, 0.985, true, "stated"},
                     {"probe capacitance", 'B', 2.2e-8, 0.007, true, "default: 2 pF, a passive probe was assumed"}};
  m.budget["R_s"] = {{"fit", 'A', 0.0028, 0.80, false, "data"},
                     {"capacitor loss", 'B', 0.0013, 0.18, true, "default: 0.0005, a film capacitor was assumed"},
                     {"capacitor", 'B', 0.0004, 0.02, true, "stated"}};
  m.findings = {{"capacitor_dominates", Severity::note,
                 "99 % of the variance of L_s comes from the capacitor: one known to 0.1 % would make the interval ten "
                 "times narrower",
                 "L_s", 0.985, Unit::one},
                {"second_mode", Severity::caution,
                 "a second mode at 301.2 kHz has 2.1 % of the amplitude: the interval of R_s was widened to cover it",
                 "CH1", 0.021, Unit::one}};
  m.cautions = {
      {"stored_energy", Severity::note, "the coil stores 120 nJ at the release", 1.2e-7, Unit::joule, "from memory"}};
  ModelSummary model;
  model.name = "damped sine";
  model.parameters["f_d"] = {232020.0, 3.1, Unit::hertz};
  model.window_s = {4e-7, 3.8e-4};
  model.residual_rms = 0.031;
  model.reduced_chi_square = 1.02;
  model.converged = true;
  m.model = model;
  m.advice = {"measure the capacitor to 0.1 % or better, or use the several-capacitor method"};
  add_traces(m);
  return m;
}

Measurement made_up_line() {
  Measurement m = made_up_ring_down();
  m.estimates = {estimate("L", 4.702e-5, 1.1e-7, Unit::henry), estimate("C_par", 2.31e-11, 1.2e-12, Unit::farad),
                 estimate("f_0", 232021.4, 3.1, Unit::hertz)};
  m.budget.clear();
  m.budget["L"] = {{"capacitors", 'B', 1.1e-7, 1.0, true, "stated"}};
  SourceRecord second = m.sources.front();
  second.source.name = "ring-22n.csv";
  m.sources.push_back(second);
  Table line{"line",
             {{"capacitance_F", Unit::farad, {}},
              {"inverse_omega_squared_s2", Unit::one, {}},
              {"u_inverse_s2", Unit::one, {}},
              {"fit_s2", Unit::one, {}}}};
  for (double c : {1e-9, 4.7e-9, 10e-9, 22e-9}) {
    const double y = kL * (c + 23e-12);
    line.columns[0].values.push_back(c);
    line.columns[1].values.push_back(y * (1 + 0.01 * std::sin(c * 1e10)));
    line.columns[2].values.push_back(0.01 * y);
    line.columns[3].values.push_back(y);
    Point point;
    point.capacitance_f = c;
    point.estimates = {estimate("f_0", 1 / (2 * std::numbers::pi * std::sqrt(y)), 5, Unit::hertz)};
    point.from = "ring.csv";
    m.points.push_back(point);
  }
  m.tables.push_back(line);
  return m;
}

Measurement made_up_refusal() {
  Measurement m;
  m.test = "ringdown";
  SourceRecord source;
  source.source = {"quiet.csv", std::string(64, 'b'), 4000, ""};
  source.samples = 200;
  m.sources = {source};
  m.findings = {{"few_cycles", Severity::note, "0.4 periods were seen", "CH1", 0.4, Unit::one},
                {"not_one_exponential", Severity::refusal,
                 "nothing that rings was found: the largest step is 1.1 times the noise, 5 times are needed", "CH1",
                 1.1, Unit::one}};
  m.advice = {"trigger on the release and show at least three periods"};
  return m;
}

Measurement made_up_ramp() {
  Measurement m;
  m.test = "ramp";
  m.sources = made_up_ring_down().sources;
  m.estimates = {estimate("L_0", 1.02e-4, 8e-7, Unit::henry), estimate("I_sat_30", 2.31, 0.03, Unit::ampere)};
  m.estimates[1].definition = "ramp_incremental";
  m.estimates[1].low = 2.27;
  m.estimates[1].high = 2.49;
  m.estimates[0].reference_a = 0.05;
  m.estimates[0].dof = 7.0;
  m.bounds = {{"I_sat_30_secant", Unit::ampere, 2.6, std::nullopt, 0.95}};
  m.tables = {{"curve",
               {{"current_A", Unit::ampere, {0, 1, 2}},
                {"incremental_H", Unit::henry, {1.02e-4, 9.9e-5, 7.9e-5}},
                {"incremental_U_H", Unit::henry, {1e-6, 1e-6, std::nan("")}}}}};
  return m;
}

Measurement made_up_sine() {
  Measurement m;
  m.test = "sine";
  m.sources = made_up_ring_down().sources;
  m.estimates = {estimate("Z", 29.5, 0.2, Unit::ohm)};
  for (double f : {1e3, 1e5}) {
    Point point;
    point.at_hz = f;
    point.level_a = 0.01;
    point.estimates = {estimate("L_s", 4.7e-5, 2e-7, Unit::henry), estimate("R_s", std::nan(""), 1e-3, Unit::ohm)};
    point.from = "data";
    m.points.push_back(point);
  }
  return m;
}

Measurement with_hostile_names(Measurement m) {
  const std::string hostile = "<script>alert(1)</script>`id`\"';\n!touch here\n\x1b[31m\xe2\x80\xae\xff&";
  m.sources.front().source.name = hostile;
  m.sources.front().source.identity = hostile;
  if (m.equipment.empty()) m.equipment.emplace_back();
  m.equipment.front().id = hostile;
  for (Finding& each : m.findings) each.about = hostile, each.message += hostile;
  for (auto& [of, lines] : m.budget) lines.front().source = hostile;
  if (m.model) m.model->left_out = {hostile};
  m.advice.push_back(hostile);
  return m;
}

}  // namespace coilassay::test

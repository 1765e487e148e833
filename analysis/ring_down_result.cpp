#include "analysis/ring_down_result.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/cautions.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

constexpr double kNearCritical = 1;          // Q below: frequency and decay are hard to tell apart
constexpr double kCapacitorRules = 0.5;      // share of the variance of L_s
constexpr double kProbeCounts = 0.01;        // of the total capacitance
constexpr double kProbeLossCounts = 0.05;    // of the decay rate
constexpr double kLossyCapacitor = 5;        // Q of the capacitor below so many times that of the circuit

std::vector<double> best_inputs(const RingDownCircuit& circuit) {
  std::vector<double> x;
  for (const InputError& input : circuit.inputs()) x.push_back(input.value);
  return x;
}

double share_of(const Measurement& result, const std::string& symbol, std::string_view source) {
  const auto lines = result.budget.find(symbol);
  if (lines == result.budget.end()) return 0;
  for (const BudgetLine& line : lines->second) {
    if (line.source == source) return line.share;
  }
  return 0;
}

}  // namespace

DecayErrors::DecayErrors(RingDownCircuit& circuit, const CaptureDecay& decay, const std::string& label,
                         std::size_t fitted_offset)
    : step_s_(decay.step_s), fitted_offset_(fitted_offset) {
  const auto seen = [&](const std::string& source, double half_width) {
    InputError input;
    input.source = source + label;
    input.kind = 'A';
    input.common = false;
    input.basis = "data";
    input.law = {ErrorLaw::Kind::rectangular, std::fabs(half_width) / std::sqrt(3.0), 0};
    return circuit.add(std::move(input));
  };
  misfit_a_ = seen("misfit of the model", decay.structure.spread_a);
  misfit_q_ = seen("misfit of the model", decay.structure.spread_q);
  start_a_ = seen("start of the window", decay.decay->start_shift_a);
  start_q_ = seen("start of the window", decay.decay->start_shift_q);
}

FittedInputs DecayErrors::fitted(const CaptureDecay& decay) const {
  FittedInputs inputs;
  inputs.values = Eigen::Vector2d(decay.a(), decay.q());
  inputs.covariance = decay.covariance();
  const double dof = decay.decay->fit.dof;
  if (!decay.structure.modes && dof > 0 && dof < 200) inputs.dof = dof;
  for (const DecayPoint& point : decay.contour) inputs.contour.emplace_back(Eigen::Vector2d(point.a, point.q));
  return inputs;
}

DecayRates DecayErrors::rates(std::span<const double> x, const RingDownCircuit& circuit) const {
  const std::size_t at = circuit.inputs().size() + fitted_offset_;
  const double a = x[at] + x[misfit_a_] + x[start_a_];
  const double q = x[at + 1] + x[misfit_q_] + x[start_q_];
  const double step = step_s_ * circuit.time_factor(x);
  const double square = a * a + q;
  DecayRates rates;
  rates.omega0 = square > 0 ? std::sqrt(square) / step : std::nan("");
  rates.alpha = a / step;
  rates.damped = q > 0 ? std::sqrt(q) / step : 0;
  return rates;
}

void describe_source(Measurement& result, const Capture& capture, const RingDownRequest& request) {
  result.test = "ringdown";
  result.sources.push_back({capture.source, capture.samples(), capture.time.step_s});
  result.equipment = request.bench.equipment;
  const auto stated = [](const std::optional<StatedValue>& value) {
    return value ? std::optional<double>(value->value) : std::nullopt;
  };
  result.conditions.level_v = stated(request.bench.level);
  result.conditions.bias_a = stated(request.bench.bias);
  result.conditions.temperature_degc = stated(request.bench.temperature);
}

ModelSummary model_of(const CaptureDecay& decay) {
  ModelSummary model;
  const Decay& d = *decay.decay;
  model.name = decay.structure.modes ? "two damped sines" : "damped sine";
  if (decay.structure.modes) model.runner_up = "damped sine";
  const double unit = decay.gain;
  model.parameters["offset"] = {unit * decay.model().c, std::nan(""), Unit::volt};
  if (decay.model().q > 0) model.parameters["amplitude"] = {unit * decay.model().envelope(0), std::nan(""), Unit::volt};
  if (decay.structure.modes && decay.structure.modes->second.q > 0) {
    const DampedSine& second = decay.structure.modes->second;
    model.parameters["second_frequency"] = {std::sqrt(second.q) / (2 * std::numbers::pi * decay.step_s), std::nan(""),
                                            Unit::hertz};
    model.parameters["second_decay"] = {second.a / decay.step_s, std::nan(""), Unit::per_second};
    model.parameters["second_amplitude"] = {unit * second.envelope(0), std::nan(""), Unit::volt};
  }
  model.window_s = {decay.start_s + static_cast<double>(d.first) * decay.step_s,
                    decay.start_s + static_cast<double>(d.end - 1) * decay.step_s};
  model.residual_rms = unit * d.fit.sigma_per_sample;
  model.reduced_chi_square = d.residuals.lack_of_fit;
  model.converged = d.fit.fit.stop == FitStop::converged;
  return model;
}

void note_damping(Measurement& result) {
  const Estimate* q = result.find("Q");
  if (q == nullptr || q->quantity.value >= kNearCritical) return;
  result.findings.push_back({"near_critical", Severity::note,
                             "with Q " + to_text(q->quantity.value, Unit::one, Script::utf8, 2) +
                                 " the circuit hardly swings: frequency and decay can be told apart only together, and their "
                                 "errors are strongly correlated; less damping across the coil gives more",
                             "Q", q->quantity.value, Unit::one});
}

void withhold(Measurement& result, const std::string& symbol) {
  std::erase_if(result.estimates, [&](const Estimate& e) { return e.symbol == symbol; });
  std::erase_if(result.correlations,
                [&](const Measurement::Correlation& c) { return c.a == symbol || c.b == symbol; });
  result.budget.erase(symbol);
}

void withhold_unresolved(Measurement& result) {
  const auto r = std::find_if(result.estimates.begin(), result.estimates.end(),
                              [](const Estimate& e) { return e.symbol == "R_s"; });
  if (r == result.estimates.end() || r->quantity.value > r->quantity.standard_uncertainty) return;
  const double high = r->high;
  const std::string ruling = result.budget["R_s"].empty() ? "" : result.budget["R_s"].front().source;
  const double ratio = r->quantity.standard_uncertainty / std::fmax(std::fabs(r->quantity.value), 1e-300);
  const bool negative = high <= 0;
  const std::string cause =
      ruling.empty() ? std::string() : " (most of it comes from: " + ruling + ")";
  if (negative) {
    result.findings.push_back({"negative_resistance", Severity::caution,
                               "what was stated to be across the coil loses more than the whole circuit does: check the "
                               "resistance across, the probe and the capacitor's dissipation; L_s, R_s and Q_coil are withheld",
                               "R_s", r->quantity.value, Unit::ohm});
  } else {
    result.bounds.push_back({"R_s", Unit::ohm, std::nullopt, high, 0.95});
    const bool unstated = !result.budget["R_s"].empty() && result.budget["R_s"].front().basis.starts_with("default");
    result.findings.push_back({"resistance_unresolved", unstated ? Severity::note : Severity::caution,
                               "the uncertainty of R_s exceeds its value" + cause + ": it is at most " +
                                   to_text(high, Unit::ohm, Script::utf8, 3),
                               "R_s", ratio, Unit::one});
  }
  withhold(result, "R_s");
  if (negative) {
    withhold(result, "L_s");
    withhold(result, "Q_coil");
    std::erase_if(result.bounds, [](const Bound& b) { return b.symbol == "Q_coil"; });
    return;
  }
  const auto q = std::find_if(result.estimates.begin(), result.estimates.end(),
                              [](const Estimate& e) { return e.symbol == "Q_coil"; });
  if (q != result.estimates.end()) {
    result.bounds.push_back({"Q_coil", Unit::one, q->low, std::nullopt, 0.95});
    withhold(result, "Q_coil");
  }
}

void note_loads(Measurement& result, const RingDownCircuit& circuit, const RingDownRequest& request) {
  const std::vector<double> x = best_inputs(circuit);
  const double total = circuit.total_capacitance(x, 0);

  const double dominant = share_of(result, "L_s", "capacitor");
  if (dominant > kCapacitorRules) {
    const bool unstated = request.bench.capacitors.front().value.law == Law::unstated;
    result.findings.push_back({"capacitor_dominates", Severity::note,
                               to_percent_text(dominant) + " of the variance of L_s is the capacitor's tolerance" +
                                   (unstated ? ", for which ±5 % was assumed: state it, as in --capacitor 10nF±1%"
                                             : ": a better known capacitor narrows the interval"),
                               "L_s", dominant, Unit::one});
  }

  const ChannelSetup& probe = request.bench.voltage;
  const double probe_c = probe.input_capacitance ? probe.input_capacitance->value : 0;
  const double assumed = probe.input_capacitance || request.propagation.exact_bench ? 0 : ring_down_defaults::kProbeCapacitance_f;
  const double capacitance_share = std::fmax(probe_c, assumed) / total;
  const double probe_g = probe.input_resistance ? 1 / probe.input_resistance->value : 0;
  const Estimate* alpha = result.find("alpha");
  const double loss_share = alpha != nullptr ? probe_g / total / (2 * alpha->quantity.value) : 0;
  if (capacitance_share > kProbeCounts || loss_share > kProbeLossCounts) {
    std::string message;
    if (capacitance_share > kProbeCounts) {
      message = assumed > 0 ? "a probe of up to 20 pF would be " + to_percent_text(capacitance_share) +
                                  " of the capacitance: state it with --probe-capacitance"
                            : "the probe is " + to_percent_text(capacitance_share) +
                                  " of the capacitance; it is taken out, with its tolerance";
    }
    if (loss_share > kProbeLossCounts) {
      message += (message.empty() ? "" : "; ") + std::string("the probe's resistance makes ") + to_percent_text(loss_share) +
                 " of the decay; it is taken out";
    }
    const bool mostly_doubt = assumed > 0 && share_of(result, "L_s", "probe capacitance") > 0.5;
    result.findings.push_back({"probe_loading", mostly_doubt ? Severity::caution : Severity::note, message, "L_s",
                               std::fmax(capacitance_share, loss_share), Unit::one});
  }

  const Estimate* q = result.find("Q");
  const std::optional<StatedValue>& dissipation = request.bench.capacitors.front().dissipation_factor;
  const double stated_d = dissipation ? dissipation->value : 0;
  if (q != nullptr && stated_d > 0 && 1 / stated_d < kLossyCapacitor * q->quantity.value) {
    const double part = stated_d * q->quantity.value;
    result.findings.push_back({"capacitor_loss", Severity::caution,
                               "the capacitor makes " + to_percent_text(part) +
                                   " of the loss: Q_coil and R_s are limited by how well its dissipation is known; a film or "
                                   "class 1 ceramic capacitor loses less",
                               "Q_coil", part, Unit::one});
  } else if (q != nullptr && !dissipation && share_of(result, "Q_coil", "dissipation of capacitor") > 0.5) {
    const double share = share_of(result, "Q_coil", "dissipation of capacitor");
    result.findings.push_back({"capacitor_loss", Severity::note,
                               "the capacitor's own loss is not stated and rules the interval of R_s and Q_coil (" +
                                   to_percent_text(share) + " of the variance): give --capacitor-dissipation",
                               "Q_coil", share, Unit::one});
  }
}

ReleaseLevel release_level(const CaptureDecay& decay, double inductance_h, double capacitance_f) {
  if (!(decay.model().q > 0)) return {};
  ReleaseLevel level;
  const std::size_t first = decay.decay->first;
  level.at_release = decay.release < first;
  const double back = level.at_release ? static_cast<double>(first - decay.release) : 0;
  level.peak_v = std::fabs(decay.gain) * decay.model().envelope(-back);
  level.peak_a = level.peak_v * std::sqrt(capacitance_f / inductance_h);
  level.energy_j = inductance_h * level.peak_a * level.peak_a / 2;
  return level;
}

void add_release_level(Measurement& result, const CaptureDecay& decay, const RingDownCircuit& circuit) {
  const Estimate* inductance = result.find("L_s");
  double henry = std::nan(""), farad = std::nan("");
  if (inductance != nullptr) {
    henry = inductance->quantity.value;
    farad = circuit.total_capacitance(best_inputs(circuit), 0);
    if (decay.model().q > 0) {
      result.conditions.peak_current_a =
          std::fabs(decay.gain) * decay.model().envelope(0) * std::sqrt(farad / henry);
    }
  }
  // People and equipment meet what was there at the release, also where the fit begins later.
  const ReleaseLevel level = release_level(decay, henry, farad);
  result.cautions = ring_down_cautions(level.peak_v, level.peak_a, level.energy_j, level.at_release);
}

}  // namespace coilassay

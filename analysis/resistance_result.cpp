#include "analysis/resistance_result.h"

#include <algorithm>
#include <cmath>

#include "base/number_text.h"

namespace coilassay {

namespace {

constexpr double kWarmingCounts = 4e-4;       // a tenth of a kelvin of copper
constexpr double kOffsetCounts = 1e-3;        // of the voltage
constexpr std::size_t kMostInFigure = 2000;

std::string readings_in_words(std::size_t count) { return std::to_string(count) + (count == 1 ? " reading" : " readings"); }

double largest(const std::vector<double>& values) {
  double most = 0;
  for (const double v : values) most = std::fmax(most, std::fabs(v));
  return most;
}

void note_warming(Measurement& result, const ResistanceLine& line, const ResistanceRequest& request) {
  const double kelvin = line.drift_ratio / request.metal.coefficient.value;
  const bool warms = line.drift_ratio > 0;
  const double share = std::fabs(line.drift_ratio);
  result.findings.push_back(
      {"warming", share > kWarmingCounts ? Severity::caution : Severity::note,
       "the resistance " + std::string(warms ? "rose by " : "fell by ") + to_percent_text(share) + " while it was read, as if the winding " +
           (warms ? "warmed" : "cooled") + " by " + to_text(std::fabs(kelvin), Unit::kelvin, Script::utf8, 2) +
           "; the value is that of the middle, and both ends are in the interval. " +
           (warms ? "Use less current, or read sooner and shorter" : "Let the winding come to rest first"),
       "R_dc", line.drift_ratio, Unit::one});
}

void note_one_polarity(Measurement& result, const ResistanceReadings& readings, const ResistanceRequest& request) {
  const double volts = largest(readings.volts);
  const double share = volts > 0 ? resistance_defaults::kThermalOffset_v / volts : 1;
  const std::string allowed = request.propagation.exact_bench
                                  ? "; nothing is allowed for it"
                                  : "; 10 µV is allowed for it, " + to_percent_text(share) + " of the voltage";
  result.findings.push_back({"thermal_offset", share > kOffsetCounts ? Severity::caution : Severity::note,
                             "all readings have one polarity, so the thermal offset of the joints and the zero errors of the "
                             "meters are not removed" + allowed + ". Read again with the current reversed",
                             "R_dc", share, Unit::one});
}

void note_temperature(Measurement& result, const ResistanceRequest& request) {
  if (request.bench.temperature && !request.cold) return;
  const double per_kelvin = request.metal.coefficient.value;
  result.findings.push_back(
      {"temperature_unknown", Severity::note,
       request.cold ? std::string("R_dc is that of the hot winding; R_dc_20 is given for a winding at rest, whose temperature is stated")
                    : "the winding's temperature was not stated, so there is no R_dc_20; R_dc changes by " +
                          to_percent_text(per_kelvin) + " per kelvin: give --temperature 23±1degC",
       "R_dc_20", per_kelvin, Unit::one});
}

}  // namespace

void describe_readings(Measurement& result, const std::vector<Capture>& captures, const ResistanceReadings& readings,
                       const ResistanceRequest& request) {
  result.test = "resistance";
  for (const Capture& capture : captures) {
    result.sources.push_back({capture.source, capture.samples(), capture.time.step_s});
  }
  result.equipment = request.bench.equipment;
  if (request.bench.temperature) result.conditions.temperature_degc = request.bench.temperature->value;
  if (readings.size() > 0) result.conditions.peak_current_a = largest(readings.amps);
  result.corrections = readings.corrections;
  result.findings = readings.findings;
}

bool note_refusals(Measurement& result, const ResistanceReadings& readings, const ResistanceLine& line) {
  using Story = ResistanceLine::Story;
  if (line.story == Story::no_current) {
    result.findings.push_back({"no_current", Severity::refusal,
                               "the current is zero in all " + readings_in_words(readings.size()) +
                                   ": check that the supply was on, and the column with --current",
                               "R_dc", 0, Unit::ampere});
    return false;
  }
  if (line.story == Story::too_few) {
    result.findings.push_back({"too_few_samples", Severity::refusal,
                               readings_in_words(readings.size()) + " with both voltage and current do not show how far readings "
                                   "scatter: at least " + std::to_string(std::max<std::size_t>(line.needed, 2)) +
                                   " are needed, better five of each polarity",
                               "R_dc", static_cast<double>(readings.size()), Unit::one});
    return false;
  }
  if (line.resistance_ohm < 0 && line.resistance_ohm < -2 * line.u_ohm) {
    result.findings.push_back({"negative_resistance", Severity::refusal,
                               "voltage and current have opposite signs (" +
                                   to_text(line.resistance_ohm, Unit::ohm, Script::utf8, 3) +
                                   "): one pair of leads is swapped. Swap it, or give --voltage-gain -1",
                               "R_dc", line.resistance_ohm, Unit::ohm});
    return false;
  }
  return true;
}

bool withhold_unresolved_resistance(Measurement& result) {
  const auto r = std::find_if(result.estimates.begin(), result.estimates.end(),
                              [](const Estimate& e) { return e.symbol == "R_dc"; });
  if (r == result.estimates.end() || r->quantity.value > r->quantity.standard_uncertainty) return true;
  const std::vector<BudgetLine>& lines = result.budget["R_dc"];
  const std::string ruling = lines.empty() ? "" : " (most of it: " + lines.front().source + ")";
  result.findings.push_back({"resistance_unresolved", Severity::refusal,
                             "the uncertainty of R_dc exceeds its value" + ruling + ": it is at most " +
                                 to_text(r->high, Unit::ohm, Script::utf8, 3) + ". Use more current, or read more often",
                             "R_dc", r->quantity.standard_uncertainty / std::fmax(std::fabs(r->quantity.value), 1e-300), Unit::one});
  if (r->high > 0) result.bounds.push_back({"R_dc", Unit::ohm, std::nullopt, r->high, 0.95});
  result.estimates.clear();
  result.budget.clear();
  result.correlations.clear();
  return false;
}

void add_model(Measurement& result, const ResistanceLine& line, const ResistanceRequest& request) {
  ModelSummary model;
  model.name = line.both_sides ? "line through both polarities" : "ratio of voltage and current";
  if (line.drifts) model.name += ", drifting";
  if (line.both_sides) {
    model.parameters["thermal_offset"] = {line.offset_v, line.u_offset_v, Unit::volt};
    result.corrections.push_back({"thermal offset", line.offset_v, Unit::volt});
  }
  if (request.bench.temperature || request.cold) {
    model.parameters["temperature_coefficient"] = {request.metal.coefficient.value, std::nan(""), Unit::one};
  }
  if (request.cold) model.parameters["rise_constant"] = {request.metal.rise_constant, std::nan(""), Unit::kelvin};
  model.residual_rms = line.residual_v;
  model.converged = true;
  result.model = std::move(model);
}

void note_readings(Measurement& result, const ResistanceReadings& readings, const ResistanceLine& line,
                   const ResistanceRequest& request) {
  if (!line.both_sides) note_one_polarity(result, readings, request);
  if (line.drifts) note_warming(result, line, request);
  note_temperature(result, request);
}

void add_resistance_traces(Measurement& result, const ResistanceReadings& readings, const ResistanceLine& line) {
  Table points{"readings", {{"current_A", Unit::ampere, {}}, {"voltage_V", Unit::volt, {}}}};
  Table fit{"line", {{"current_A", Unit::ampere, {}}, {"voltage_V", Unit::volt, {}}}};
  Table order{"order",
              {{readings.timed ? "time_s" : "reading", readings.timed ? Unit::second : Unit::one, {}},
               {"resistance_ohm", Unit::ohm, {}},
               {"trend_ohm", Unit::ohm, {}}}};
  const double offset = line.both_sides ? line.offset_v : 0;
  const double first = readings.order.front(), last = readings.order.back();
  const std::size_t stride = (readings.size() + kMostInFigure - 1) / kMostInFigure;
  double low = 0, high = 0;
  for (std::size_t i = 0; i < readings.size(); i += stride) {
    points.columns[0].values.push_back(readings.amps[i]);
    points.columns[1].values.push_back(readings.volts[i]);
    low = std::fmin(low, readings.amps[i]);
    high = std::fmax(high, readings.amps[i]);
    if (line.side[i] == 0) continue;
    const double t = last > first ? (readings.order[i] - first) / (last - first) - 0.5 : 0;
    order.columns[0].values.push_back(readings.order[i]);
    order.columns[1].values.push_back((readings.volts[i] - offset) / readings.amps[i]);
    order.columns[2].values.push_back(line.resistance_ohm * (1 + line.drift_ratio * t));
  }
  for (const double i : {low, high}) {
    fit.columns[0].values.push_back(i);
    fit.columns[1].values.push_back(offset + line.resistance_ohm * i);
  }
  for (Table* table : {&points, &fit, &order}) result.tables.push_back(std::move(*table));
}

}  // namespace coilassay

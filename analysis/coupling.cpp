#include "analysis/coupling.h"

#include <cmath>

#include "analysis/coupling_findings.h"
#include "analysis/coupling_matrix.h"
#include "analysis/coupling_readings.h"
#include "analysis/coupling_result.h"
#include "analysis/coupling_solution.h"
#include "analysis/coupling_traces.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

constexpr double kTwoPi = 2 * 3.141592653589793238;

std::vector<CouplingPrior> priors_of(const CouplingRequest& request, bool shorted) {
  std::vector<CouplingPrior> priors;
  const auto add = [&](std::size_t unknown, const char* source, const std::optional<StatedValue>& stated, double half_width,
                       const std::string& reason) {
    if (!stated) return;
    priors.push_back({unknown, input_error(source, *stated, {half_width, reason}, request.propagation)});
  };
  const auto ratio = [](const std::optional<StatedValue>& stated, double part) { return stated ? part * std::fabs(stated->value) : 0; };
  using namespace coupling_defaults;
  add(kR1, "winding resistance", request.winding_resistance_1, ratio(request.winding_resistance_1, kWindingRatio), "±5 %");
  add(kR2, "winding resistance", request.winding_resistance_2, ratio(request.winding_resistance_2, kWindingRatio), "±5 %");
  if (!shorted) return priors;
  if (request.link_inductance) {
    add(kLink, "inductance of the short", request.link_inductance, ratio(request.link_inductance, kLinkRatio), "±20 %");
  } else if (!request.propagation.exact_bench) {
    add(kLink, "inductance of the short", StatedValue::unstated(0, Unit::henry), kLink_h, "up to 20 nH");
  }
  add(kLinkR, "resistance of the short", request.link_resistance, ratio(request.link_resistance, kLinkRatio), "±20 %");
  return priors;
}

/// Points are asked for only where something was read.
Result<void> check_frequencies(const CouplingRequest& request, const CouplingReadings& readings) {
  double low = HUGE_VAL, high = 0;
  for (const CouplingTrace& trace : readings.traces) {
    if (!trace.scatter) continue;
    for (const CouplingReading& r : trace.readings) {
      low = std::fmin(low, r.omega / kTwoPi);
      high = std::fmax(high, r.omega / kTwoPi);
    }
  }
  if (!(high > 0)) return {};
  for (const double f : request.at_hz) {
    if (f >= low * 0.999 && f <= high * 1.001) continue;
    return failure(Problem::usage, "--at", to_text(f, Unit::hertz) + " lies outside the sweeps, which go from " + to_text(low, Unit::hertz) +
                       " to " + to_text(high, Unit::hertz),
                   "ask for a frequency inside, or leave --at out for the values at low frequency");
  }
  return {};
}

Result<void> check_resistances(const CouplingRequest& request, const CouplingReadings& readings) {
  if (!request.winding_resistance_1 && !request.winding_resistance_2 && !request.link_resistance) return {};
  for (const CouplingTrace& trace : readings.traces) {
    for (const CouplingReading& r : trace.readings) {
      if (std::isfinite(r.omega)) return {};
    }
  }
  return failure(Problem::usage, request.link_resistance ? "--link-resistance" : "--winding-resistance",
                 "what a resistance does depends on the frequency, and none is stated",
                 "give the frequency of the values with --at 10kHz, or behind each of them: 19uH±1%@10kHz");
}

}  // namespace

Result<Measurement> measure_coupling(const CouplingRequest& request) {
  Result<CouplingReadings> readings = coupling_readings(request);
  if (!readings) return failure(readings);
  if (auto fine = check_frequencies(request, *readings); !fine) return failure(fine);
  if (auto fine = check_resistances(request, *readings); !fine) return failure(fine);
  Measurement result;
  result.test = "coupling";
  result.sources = readings->sources;
  result.findings = readings->findings;
  result.equipment = request.bench.equipment;
  if (!request.at_hz.empty()) result.conditions.frequency_hz = request.at_hz.front();
  if (request.bench.level) result.conditions.level_v = request.bench.level->value;
  if (std::isfinite(readings->level_a)) result.conditions.level_a = readings->level_a;
  if (request.bench.temperature) result.conditions.temperature_degc = request.bench.temperature->value;
  bool shorted = false;
  for (const CouplingTrace& trace : readings->traces) {
    shorted = shorted || trace.item == CouplingItem::primary_short || trace.item == CouplingItem::secondary_short;
  }
  if (shorted && request.link_inductance) result.corrections.push_back({"inductance of the short", request.link_inductance->value, Unit::henry});
  if (shorted && request.link_resistance) result.corrections.push_back({"resistance of the short", request.link_resistance->value, Unit::ohm});
  if (request.ports && request.ports->ports > 2) add_matrices(result, *request.ports, request);
  if (readings->traces.empty()) {
    result.findings.push_back({"too_few_inputs", Severity::refusal, "nothing usable was measured on the windings", "k", 0, Unit::one});
    return result;
  }
  const CouplingSolution solution = solve_coupling(std::move(*readings), priors_of(request, shorted));
  const CouplingVerdict verdict = add_coupling(result, solution, request);
  judge_coupling(result, solution, verdict, request);
  if (request.traces) add_coupling_traces(result, solution);
  return result;
}

}  // namespace coilassay

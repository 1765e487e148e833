#include "analysis/coupling_advice.h"

#include <algorithm>
#include <cmath>

#include "analysis/coupling.h"
#include "analysis/coupling_readings.h"
#include "analysis/coupling_result.h"
#include "analysis/coupling_solution.h"

namespace coilassay {

namespace {

struct Recipe {
  const char* name;
  const char* words;
  std::vector<CouplingItem> items;
};

std::vector<Recipe> recipes() {
  using enum CouplingItem;
  return {{"open_short_primary", "primary open and shorted", {primary_open, primary_short}},
          {"open_short_secondary", "secondary open and shorted", {secondary_open, secondary_short}},
          {"open_short_both", "open and shorted, both sides", {primary_open, primary_short, secondary_open, secondary_short}},
          {"series", "aiding and opposing, both open", {primary_open, secondary_open, aiding, opposing}},
          {"ratios", "voltage ratios both ways", {ratio_forward, ratio_reverse}},
          {"ratio_and_opens", "forward ratio, both open", {primary_open, secondary_open, ratio_forward}},
          {"all", "all of these together",
           {primary_open, primary_short, secondary_open, secondary_short, aiding, opposing, ratio_forward, ratio_reverse}}};
}

CouplingMethod predicted_method(const Recipe& recipe, const CouplingAdviceRequest& request) {
  WindingPair pair;
  pair.l1_h = request.l1_h;
  pair.l2_h = request.l2_h;
  pair.m_h = request.k * std::sqrt(request.l1_h * request.l2_h);
  pair.m_squared_h2 = pair.m_h * pair.m_h;
  CouplingRequest ask;
  ask.propagation.exact_bench = true;
  for (const CouplingItem item : recipe.items) {
    const double value = predicted_ideal(item, pair);
    const Unit unit = is_ratio(item) ? Unit::one : Unit::henry;
    const double half = (is_ratio(item) ? request.ratio_accuracy : request.accuracy) * value;
    ask.inputs.push_back({item, CouplingValue{StatedValue::rectangular(value, half, unit), std::nullopt}});
  }
  CouplingMethod method;
  method.name = recipe.name;
  method.words = recipe.words;
  method.items = recipe.items;
  Result<CouplingReadings> readings = coupling_readings(ask);
  if (!readings) return method;   // cannot be: values without frequency are always clear
  const CouplingSolution solution = solve_coupling(std::move(*readings), {});
  const CouplingVerdict verdict = coupling_verdict(solution, false);
  method.low = verdict.low;
  method.high = verdict.high;
  method.at_low = verdict.at_low;
  method.at_high = verdict.at_high;
  const double u = std::sqrt(solution.fit.covariance(kCoupling, kCoupling));
  method.u = !verdict.shown ? std::nan("") : solution.squared ? u / (2 * request.k) : u;
  if (request.wanted) {
    const double half = std::fmax(method.high - request.k, request.k - method.low);
    method.reaches = half <= *request.wanted * std::fmin(request.k, 1 - request.k);
  }
  return method;
}

}  // namespace

Result<CouplingAdvice> advise_coupling(const CouplingAdviceRequest& request) {
  const bool fine = request.l1_h > 0 && request.l2_h > 0 && request.k > 0 && request.k < 1 && request.accuracy > 0 && request.accuracy < 1 &&
                    request.ratio_accuracy > 0 && request.ratio_accuracy < 1;
  if (!fine) {
    return failure(Problem::bad_number, "--rough", "windings with these values cannot be",
                   "give two inductances and a coupling between 0 and 1: --rough 100uH,400uH,0.9");
  }
  CouplingAdvice advice;
  advice.request = request;
  double narrowest = HUGE_VAL;
  for (const Recipe& recipe : recipes()) {
    advice.methods.push_back(predicted_method(recipe, request));
    const CouplingMethod& method = advice.methods.back();
    if (method.name == "all") continue;
    if (method.high - method.low < narrowest * (1 - 1e-9)) {
      narrowest = method.high - method.low;
      advice.best = method.name;
    }
  }
  std::vector<const CouplingMethod*> enough;
  for (const CouplingMethod& method : advice.methods) {
    if (method.reaches == true) enough.push_back(&method);
  }
  std::stable_sort(enough.begin(), enough.end(), [](const CouplingMethod* a, const CouplingMethod* b) { return a->items.size() < b->items.size(); });
  for (const CouplingMethod* method : enough) advice.sufficient.push_back(method->name);
  return advice;
}

}  // namespace coilassay

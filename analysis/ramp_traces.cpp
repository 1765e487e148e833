// What the figure of a ramp shows, and what the pulse does to people and parts.
#include <algorithm>
#include <cmath>

#include "analysis/cautions.h"
#include "analysis/ramp_result.h"

namespace coilassay {

namespace {

constexpr std::size_t kPoints = 1500;

}  // namespace

void add_ramp_traces(Measurement& result, const RampLayout& layout, const RampStory* story) {
  Table table{"trace_ramp", {{"time_s", Unit::second, {}}, {"voltage_V", Unit::volt, {}}, {"current_A", Unit::ampere, {}}}};
  const std::size_t stride = std::max<std::size_t>(layout.amps.size() / kPoints, 1);
  for (std::size_t i = 0; i < layout.amps.size(); i += stride) {
    table.columns[0].values.push_back(layout.start_s + static_cast<double>(i) * layout.step_s);
    table.columns[1].values.push_back(layout.volts[i]);
    table.columns[2].values.push_back(layout.amps[i]);
  }
  if (!table.columns[0].values.empty()) result.tables.push_back(std::move(table));
  if (story == nullptr) return;
  Table flux{"trace_flux", {{"time_s", Unit::second, {}}, {"flux_Wb", Unit::weber, {}}}};
  for (const PulseIntegrals& pulse : story->integrals) {
    const std::vector<double> values = pulse.flux(story->resistance.error.value);
    const std::size_t step = std::max<std::size_t>(values.size() / kPoints, 1);
    for (std::size_t k = 0; k < values.size(); k += step) {
      flux.columns[0].values.push_back(layout.start_s + static_cast<double>(pulse.first + k) * layout.step_s);
      flux.columns[1].values.push_back(values[k]);
    }
    flux.columns[0].values.push_back(flux.columns[0].values.back());   // pulses are not joined
    flux.columns[1].values.push_back(std::nan(""));
  }
  result.tables.push_back(std::move(flux));
}

void add_ramp_cautions(Measurement& result, const RampStory& story) {
  const RampCurve& curve = story.shown();
  const std::size_t p = story.first_counted();
  const RampPulse& pulse = story.layout.pulses[p];
  double square = 0;   // integral of i^2 dt over the pulse
  const std::vector<double>& i = story.layout.amps;
  for (std::size_t k = pulse.start; k < std::min(pulse.end, i.size()); ++k) square += i[k] * i[k] * story.layout.step_s;
  RampLoad load;
  load.peak_a = curve.high_a;
  load.energy_j = curve.values[ramp_output::kEnergy];
  load.inductance_h = curve.values[ramp_output::kL0];
  load.fall_seen = pulse.returns;
  load.winding_j = story.resistance.error.value * square;
  load.winding_assumed = story.resistance.from == RampResistance::From::unknown;
  const BenchSetup& bench = story.request->bench;
  if (bench.current.shunt) {
    load.shunt_j = bench.current.shunt->value * square;
    load.shares_earth = !bench.voltage.low_column && !bench.current.low_column;
  }
  const auto& pulses = story.layout.pulses;
  if (pulses.size() > 1) {
    load.period_s = static_cast<double>(pulses.back().start - pulses.front().start) * story.layout.step_s /
                    static_cast<double>(pulses.size() - 1);
  }
  for (Caution& caution : ramp_cautions(load)) result.cautions.push_back(std::move(caution));
}

}  // namespace coilassay

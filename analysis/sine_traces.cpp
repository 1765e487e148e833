// What a figure of a steady sine needs.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/sine_record.h"
#include "base/random.h"

namespace coilassay {

namespace {

constexpr std::size_t kPoints = 2000;
constexpr double kPeriodsShown = 4;

struct Model {
  const FittedSine& channel;
  double omega, centre;
  double operator()(double n) const {
    const double angle = omega * (n - centre);
    double v = channel.offset + (channel.phasor * std::polar(1.0, angle)).real();
    for (std::size_t h = 0; h < channel.harmonics.size(); ++h) {
      if (std::abs(channel.harmonics[h]) < 5 * channel.harmonic_u) continue;
      v += (channel.harmonics[h] * std::polar(1.0, static_cast<double>(h + 2) * angle)).real();
    }
    return v;
  }
};

}  // namespace

void add_sine_traces(Measurement& result, const SineRecord& sine) {
  const DrivenRecord& r = sine.record;
  const std::span<const double> volts = sine.volts(), amps = sine.amps();
  const auto time = [&](double n) { return r.start_s + (static_cast<double>(sine.first) + n) * r.step_s; };
  Table capture{"trace_capture",
                {{"time_s", Unit::second, {}}, {"voltage_V", Unit::volt, {}}, {"current_A", Unit::ampere, {}}}};
  // A few periods show the shape; the whole record would be a block of ink.
  const double shown = sine.fit ? kPeriodsShown * 2 * std::numbers::pi / sine.fit->omega : static_cast<double>(kPoints);
  const auto end = std::min(volts.size(), static_cast<std::size_t>(shown) + 1);
  const std::size_t stride = end / kPoints + 1;
  for (std::size_t n = 0; n < end; n += stride) {
    capture.columns[0].values.push_back(time(static_cast<double>(n)));
    capture.columns[1].values.push_back(volts[n]);
    capture.columns[2].values.push_back(amps[n]);
  }
  result.tables.push_back(std::move(capture));
  if (!sine.fit) return;

  const Model v{sine.fit->channels[0], sine.fit->omega, sine.fit->centre};
  const Model i{sine.fit->channels[1], sine.fit->omega, sine.fit->centre};
  Table fit{"trace_fit", {{"time_s", Unit::second, {}}, {"fit_V", Unit::volt, {}}, {"fit_A", Unit::ampere, {}}}};
  for (std::size_t k = 0; k <= 400; ++k) {
    const double n = static_cast<double>(end - 1) * static_cast<double>(k) / 400;
    fit.columns[0].values.push_back(time(n));
    fit.columns[1].values.push_back(v(n));
    fit.columns[2].values.push_back(i(n));
  }
  result.tables.push_back(std::move(fit));

  // One residual of each block, its place in the block scattered so that no beat with the signal shows.
  Table left{"trace_residual",
             {{"time_s", Unit::second, {}}, {"residual_V", Unit::volt, {}}, {"residual_A", Unit::ampere, {}}}};
  const std::size_t block = std::max<std::size_t>(end / kPoints, 1);
  Random random(1);
  for (std::size_t at = 0; at < end; at += block) {
    const std::size_t n = std::min<std::size_t>(at + random.below(block), end - 1);
    left.columns[0].values.push_back(time(static_cast<double>(n)));
    left.columns[1].values.push_back(volts[n] - v(static_cast<double>(n)));
    left.columns[2].values.push_back(amps[n] - i(static_cast<double>(n)));
  }
  result.tables.push_back(std::move(left));

  const SineInputs inputs(sine);
  const SineInputs::Draw best = inputs.draw(inputs.best());
  const std::complex<double> z = best.volts / best.amps;
  result.tables.push_back({"trace_impedance",
                           {{"resistance_ohm", Unit::ohm, {0, z.real(), z.real()}},
                            {"reactance_ohm", Unit::ohm, {0, 0, z.imag()}}}});
}

}  // namespace coilassay

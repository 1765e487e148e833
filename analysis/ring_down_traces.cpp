#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/ring_down_decay.h"
#include "base/random.h"

namespace coilassay {

namespace {

constexpr std::size_t kPoints = 2000;

/// Smallest and largest of each block of samples, in the order they stand: no crest is lost.
Table thin_out(const CaptureDecay& decay, std::size_t first, std::size_t end) {
  Table table{"trace_capture", {{"time_s", Unit::second, {}}, {"voltage_V", Unit::volt, {}}}};
  const std::size_t block = std::max<std::size_t>((end - first) / (kPoints / 2), 1);
  const auto keep = [&](std::size_t i) {
    table.columns[0].values.push_back(decay.start_s + static_cast<double>(i) * decay.step_s);
    table.columns[1].values.push_back(decay.gain * decay.samples[i]);
  };
  for (std::size_t at = first; at < end; at += block) {
    std::size_t low = at, high = at;
    double least = INFINITY, most = -INFINITY;
    for (std::size_t i = at; i < std::min(at + block, end); ++i) {
      const double v = decay.samples[i];
      if (v < least) least = v, low = i;
      if (v > most) most = v, high = i;
    }
    if (!(most >= least)) continue;  // nothing but missing samples
    keep(std::min(low, high));
    if (low != high) keep(std::max(low, high));
  }
  return table;
}

/// One residual of each block, its place in the block scattered so that no beat with the signal shows: extremes would make
/// the noise look like two bands.
Table some_residuals(const CaptureDecay& decay, std::size_t first, std::size_t end) {
  Table table{"trace_residual", {{"time_s", Unit::second, {}}, {"residual_V", Unit::volt, {}}}};
  const std::size_t block = std::max<std::size_t>((end - first) / kPoints, 1);
  const DampedSine& model = decay.model();
  Random random(1);
  for (std::size_t at = first; at < end; at += block) {
    const std::size_t i = std::min(at + random.below(block), end - 1);
    const double n = static_cast<double>(i) - static_cast<double>(decay.decay->first);
    double v = decay.samples[i] - model(n);
    if (decay.structure.modes) v -= decay.structure.modes->second(n);
    if (std::isnan(v)) continue;
    table.columns[0].values.push_back(decay.start_s + static_cast<double>(i) * decay.step_s);
    table.columns[1].values.push_back(decay.gain * v);
  }
  return table;
}

}  // namespace

void add_traces(Measurement& result, const CaptureDecay& decay) {
  if (!decay.decay) {
    if (!decay.samples.empty()) result.tables.push_back(thin_out(decay, 0, decay.samples.size()));
    return;
  }
  const DampedSine& model = decay.model();
  const std::size_t first = decay.decay->first;
  // Eight decay times show everything; the noise after them would only squeeze the picture.
  const double lasting = model.a > 0 ? 8 / model.a : INFINITY;
  const std::size_t end =
      std::min(decay.decay->end, first + static_cast<std::size_t>(std::fmin(lasting, 1e15)) + 16);
  const std::size_t lead = std::min(first, (end - first) / 6);
  result.tables.push_back(thin_out(decay, first - lead, end));

  Table fit{"trace_fit",
            {{"time_s", Unit::second, {}},
             {"fit_V", Unit::volt, {}},
             {"envelope_high_V", Unit::volt, {}},
             {"envelope_low_V", Unit::volt, {}}}};
  // A dozen points a period; where that is too many to draw, the envelope alone shows the fit.
  const double cycles = model.damped_omega() * static_cast<double>(end - first) / (2 * std::numbers::pi);
  const bool drawable = 12 * cycles <= 2 * kPoints;
  const auto points = drawable ? std::max<std::size_t>(static_cast<std::size_t>(12 * cycles), 400) : 400;
  for (std::size_t k = 0; k <= points; ++k) {
    const double n = static_cast<double>(end - 1 - first) * static_cast<double>(k) / static_cast<double>(points);
    double v = drawable ? model(n) : std::nan("");
    if (decay.structure.modes) v += decay.structure.modes->second(n);
    const double half = model.q > 0 ? model.envelope(n) : std::nan("");
    fit.columns[0].values.push_back(decay.start_s + (static_cast<double>(first) + n) * decay.step_s);
    fit.columns[1].values.push_back(decay.gain * v);
    fit.columns[2].values.push_back(decay.gain * (model.c + half));
    fit.columns[3].values.push_back(decay.gain * (model.c - half));
  }
  result.tables.push_back(std::move(fit));
  result.tables.push_back(some_residuals(decay, first, end));
}

}  // namespace coilassay

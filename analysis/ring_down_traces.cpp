#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/ring_down_decay.h"

namespace coilassay {

namespace {

constexpr std::size_t kPoints = 2000;

/// Smallest and largest of each block of samples, in the order they stand: no crest is lost.
Table thin_out(const char* name, const char* value_name, const CaptureDecay& decay, std::size_t first, std::size_t end,
               bool residual) {
  Table table{name, {{"time_s", Unit::second, {}}, {value_name, Unit::volt, {}}}};
  const std::size_t block = std::max<std::size_t>((end - first) / (kPoints / 2), 1);
  const DampedSine& model = decay.model();
  const bool both = decay.structure.modes.has_value();
  const auto value_at = [&](std::size_t i) {
    double v = decay.samples[i];
    if (residual) {
      const double n = static_cast<double>(i) - static_cast<double>(decay.decay->first);
      v -= model(n);
      if (both) v -= decay.structure.modes->second(n);
    }
    return decay.gain * v;
  };
  const auto keep = [&](std::size_t i) {
    table.columns[0].values.push_back(decay.start_s + static_cast<double>(i) * decay.step_s);
    table.columns[1].values.push_back(value_at(i));
  };
  for (std::size_t at = first; at < end; at += block) {
    std::size_t low = at, high = at;
    const std::size_t stop = std::min(at + block, end);
    // A residual costs a model value each: some hundred per block show its extent well enough.
    const std::size_t stride = residual ? block / 64 + 1 : 1;
    double least = INFINITY, most = -INFINITY;
    for (std::size_t i = at; i < stop; i += stride) {
      const double v = residual ? value_at(i) : decay.samples[i];
      if (v < least) least = v, low = i;
      if (v > most) most = v, high = i;
    }
    if (!(most >= least)) continue;  // nothing but missing samples
    keep(std::min(low, high));
    if (low != high) keep(std::max(low, high));
  }
  return table;
}

}  // namespace

void add_traces(Measurement& result, const CaptureDecay& decay) {
  if (!decay.decay) {
    if (!decay.samples.empty()) {
      CaptureDecay whole = decay;
      result.tables.push_back(thin_out("trace_capture", "voltage_V", whole, 0, decay.samples.size(), false));
    }
    return;
  }
  const DampedSine& model = decay.model();
  const std::size_t first = decay.decay->first;
  // Eight decay times show everything; the noise after them would only squeeze the picture.
  const double lasting = model.a > 0 ? 8 / model.a : INFINITY;
  const std::size_t end =
      std::min(decay.decay->end, first + static_cast<std::size_t>(std::fmin(lasting, 1e15)) + 16);
  const std::size_t lead = std::min(first, (end - first) / 6);
  result.tables.push_back(thin_out("trace_capture", "voltage_V", decay, first - lead, end, false));

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
  result.tables.push_back(thin_out("trace_residual", "residual_V", decay, first, end, true));
}

}  // namespace coilassay

#include "fitting/damped_sine_plan.h"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace coilassay {
namespace {

constexpr double kManyCycles = 25;

// The largest length up to `most` that leaves few samples over.
std::size_t good_length(std::size_t span, double most) {
  const std::size_t longest = std::max<std::size_t>(1, static_cast<std::size_t>(most));
  std::size_t best = longest;
  for (std::size_t length = longest; length > longest - longest / 8 && length > 0; --length) {
    if (span % length < span % best) best = length;
  }
  return best;
}

// The part of the record where something is left of the oscillation: thirty of its time constants.
std::size_t ringing_part(std::size_t samples, double slow_decay) {
  const double n = static_cast<double>(samples);
  if (slow_decay <= 0 || 30 / slow_decay > 0.9 * n) return samples;
  return std::max<std::size_t>(16, static_cast<std::size_t>(30 / slow_decay));
}

}  // namespace

Plan plan_with_length(std::size_t samples, std::size_t span, double most_length, double omega) {
  Plan plan;
  plan.omega = omega;
  // Three numbers from fewer than six samples would be no compression: every sample by itself is exact then.
  if (omega != 0 && most_length < 6) {
    most_length = 1;
    plan.omega = 0;
  }
  plan.length = good_length(span, most_length);
  plan.count = span / plan.length;
  plan.tail_from = span < samples ? plan.length * plan.count : samples;
  return plan;
}

Plan plan_for(const Shape& shape, double omega_uncertainty, std::size_t samples) {
  const std::size_t span = ringing_part(samples, shape.slow_decay());
  const double length = static_cast<double>(span);
  const double omega = shape.omega();
  if (omega * length > kManyCycles * 2 * std::numbers::pi) {
    double most = length / 512;
    if (shape.a > 0) most = std::min(most, 0.05 / shape.a);
    // The signal must stay inside the band of the blocks.
    if (omega_uncertainty > 0) most = std::min(most, 0.05 / omega_uncertainty);
    return plan_with_length(samples, span, most, omega);
  }
  double most = std::min(length / 256, 0.1 / std::max(shape.fast_decay(), 1e-300));
  if (omega > 0) most = std::min(most, 2 * std::numbers::pi / omega / 64);
  return plan_with_length(samples, span, most, 0);
}

bool plan_fits(const Plan& plan, const Shape& shape, std::size_t samples) {
  const std::size_t span = ringing_part(samples, shape.slow_decay());
  const double covered = plan.tail_from < samples ? static_cast<double>(plan.tail_from) : static_cast<double>(samples);
  const double length = static_cast<double>(plan.length);
  if (plan.length * plan.count * 8 < span * 7 && plan.tail_from == samples) return false;
  if (plan.tail_from < samples && covered < 0.7 * static_cast<double>(span)) return false;
  if (plan.length == 1) return true;
  if (plan.omega != 0) return std::abs(shape.omega() - plan.omega) * length < 0.25 && shape.a * length < 0.06;
  return shape.fast_decay() * length < 0.13 && shape.omega() * length < 2 * std::numbers::pi / 50;
}

WhiteBlocks compress(std::span<const double> y, Plan& plan, double reference) {
  for (;;) {
    WhiteBlocks blocks = white_blocks(y, plan.length, plan.count, plan.omega, reference, plan.tail_from);
    // Missing samples cost whole blocks; shorter blocks lose less.
    if (plan.length == 1 || blocks.lost * 20 < blocks.present_blocks * blocks.length + blocks.lost) return blocks;
    const double shorter = static_cast<double>(plan.length) / 4;
    plan = plan_with_length(y.size(), plan.tail_from, shorter, plan.omega);
  }
}

WhiteBlocks compress(std::span<const double> y, Plan& plan, ShortSums& sums, double reference) {
  const std::size_t each = sums.length;
  // Where most of the record is still to be read, reading it with longer blocks is quicker.
  const bool most_read = sums.sum.size() * each * 2 > y.size();
  const bool serve = each > 1 && (most_read || each >= 1024) && plan.length >= each &&
                     plan.omega * static_cast<double>(each) < 0.15 && sums.reference == reference && sums.complete(y);
  if (!serve) return compress(y, plan, reference);
  const std::size_t span = plan.tail_from < y.size() ? plan.tail_from : y.size();
  plan.length = each * good_length(span / each, static_cast<double>(plan.length / each));
  plan.count = span / plan.length;
  if (plan.tail_from < y.size()) plan.tail_from = plan.length * plan.count;
  return white_blocks(y, sums, plan.length, plan.count, plan.omega, plan.tail_from);
}

}  // namespace coilassay

// From the samples of a record to the least-squares solution on blocks that suit it. Internal to this room.
#pragma once

#include <optional>
#include <span>

#include "fitting/damped_sine.h"
#include "fitting/damped_sine_plan.h"
#include "fitting/damped_sine_search.h"
#include "fitting/damped_sine_start.h"

namespace coilassay {

/// Fewer samples than this are not fitted.
constexpr std::size_t kFewestSamples = 16;

/// Solution on blocks that suit it.
struct Settled {
  Solution<1> solution;
  WhiteBlocks blocks;
  Plan plan;
};

/// A first fit around the strongest line: of some dozen shapes the best, then its least squares. Shape per sample of y.
std::optional<Shape> first_shape(std::span<const double> y, const Beginning& beginning);

/// Fits again until the blocks suit the solution they lead to. Short sums of y, when there are any, spare reading it.
Settled settle(std::span<const double> y, const Shape& start, double reference, ShortSums sums = {});

/// The solution begun behind the longest gap, when the record has a long one. A gap soon after the start can leave the
/// fit a cycle off between its two sides; the longer side alone knows better, and decay and frequency do not depend on
/// where counting starts.
std::optional<Settled> settle_after_gap(std::span<const double> y, const WhiteBlocks& blocks, double reference);

DampedSine model_of(const Settled& settled);

}  // namespace coilassay

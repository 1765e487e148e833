// Which block sums to take so that nothing is lost. Internal to this room.
#pragma once

#include <cstddef>
#include <span>

#include "fitting/damped_sine_equations.h"

namespace coilassay {

/// Blocks over the part of the record that rings, and the rest as one tail.
struct Plan {
  std::size_t length = 1;
  std::size_t count = 0;
  double omega = 0;           // 0: plain sums
  std::size_t tail_from = 0;  // the number of samples: no tail
};

/// Blocks of at most `most_length` over y[0, span) of `samples`; omega 0 for plain sums.
Plan plan_with_length(std::size_t samples, std::size_t span, double most_length, double omega);

/// The plan for a known shape. Variance lost against a fit of every sample, with B the length of a block: (aB)^2 / 3
/// when demodulated, which is taken for more than 25 cycles, (decay B)^2 / 12 and (omega B)^2 / 12 for plain sums.
Plan plan_for(const Shape& shape, double omega_uncertainty, std::size_t samples);

/// Whether a solution found with a plan has the shape the plan was made for.
bool plan_fits(const Plan& plan, const Shape& shape, std::size_t samples);

/// Takes the sums. Missing samples cost whole blocks: as long as more than a twentieth is lost that way the blocks are
/// made shorter, down to single samples.
WhiteBlocks compress(std::span<const double> y, Plan& plan, double reference);

/// The same from short sums of all of y where they serve: without missing samples and with less than 0.15 rad per short
/// block (two thousandths of the variance are lost). Blocks are then whole numbers of short ones. Otherwise as above.
WhiteBlocks compress(std::span<const double> y, Plan& plan, ShortSums& sums, double reference);

}  // namespace coilassay

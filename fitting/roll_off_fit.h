// A roll-off fitted to noisy y over a nearly noise-free x, by block means; and the same data without a model.
#pragma once

#include <Eigen/Core>
#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "base/result.h"
#include "fitting/fit.h"
#include "fitting/roll_off.h"

namespace coilassay {

/// Means of x and y over blocks of samples, and what the samples inside the blocks say about noise.
struct RollOffBlocks {
  std::vector<double> x, y;
  std::vector<std::size_t> first;   // first sample of each block
  std::size_t length = 0;        // samples of a block
  double sigma = 0;              // of one sample of y about straight lines through its block
  double sigma_of_mean = 0;      // of a block mean: sigma/sqrt(length), and rounding that the noise does not dither
  double dof = 0;                // of sigma
};

/// Blocks over [first, end) of two arrays; at least 8 samples each, `most` blocks at most; what does not fill a block is left
/// out at the beginning. Blocks with a NaN are left out.
/// Rounding of y to steps of `resolution` (NaN or 0: none) that noise leaves undithered widens sigma_of_mean.
/// Fewer than 24 samples give no blocks.
RollOffBlocks roll_off_blocks(std::span<const double> x, std::span<const double> y, std::size_t first, std::size_t end,
                              std::size_t most, double resolution);

/// What is known beside the blocks.
struct RollOffKnown {
  std::optional<double> offset;       // y where x is 0, from a stretch of its own ...
  double offset_sigma = 0;            // ... with its standard uncertainty
  double shift_sigma = 0;             // of the origin of x, around 0; infinity: not known at all
  double walk_variance = 0;           // of x, per block: the integral of white noise is a random walk
  bool bend = false;                  // fit b too
  bool straight = false;              // g = g0: only slope, offset and shift
};

/// Model: y = offset + Y(x + shift; g0, s, k, m, b), Y the inverse of RollOff's integral.
///
/// Parameters in order: ln g0, s, ln k, ln m, offset, shift, b. Those that a record hardly shows (the floor share of one
/// that ends before its knee) are held by wide laws of what coils are made of: ln m around ln 5 within 1, s around 0.1
/// within 0.3, ln k around ln of twice the largest y within 1.5, b around 0 within 1 (standard deviations); where the data
/// speak these weigh nothing (docs/formulas.md#ramp).
struct RollOffFit {
  Fit fit;                     // covariance: noise of y, scaled up by the lack of fit where that is significant, and of x
  RollOff curve;
  double offset = 0, shift = 0;
  double lack_of_fit = 0;      // F: variance of block means about the curve over that inside the blocks
  double f_probability = 1;    // of an F so large by chance
  double chi_square = 0;       // over known sigma, priors included
  std::size_t blocks = 0;
  std::vector<double> predicted;   // y of each block by the fit

  /// First-order change of the parameters when the data change by dy and dx (one number per block).
  Eigen::VectorXd response(std::span<const double> dy, std::span<const double> dx) const;

  // Kept for response(): derivatives of the prediction to the parameters, 1/g at each block, inverse of the weighted
  // normal matrix and the weight of a block.
  Eigen::MatrixXd jacobian;
  Eigen::VectorXd inverse_slope;
  Eigen::MatrixXd inverse_normal;
  double weight = 0;
};

/// too_few_samples below 12 blocks; bad_number when y or x does not move; not_converged.
Result<RollOffFit> fit_roll_off(const RollOffBlocks& blocks, const RollOffKnown& known);

/// A least-squares cubic spline y(x) with 10 even knots: no model at all.
class RollOffSpline {
 public:
  /// rank_deficient when the blocks do not cover the span.
  static Result<RollOffSpline> fit(const RollOffBlocks& blocks);
  double y(double x) const;
  double slope(double x) const;   // dx/dy = 1/y'
  double low() const { return low_; }
  double high() const { return high_; }
  double lack_of_fit() const { return lack_of_fit_; }

 private:
  double low_ = 0, high_ = 1, lack_of_fit_ = 0;
  Eigen::VectorXd coefficients_;
};

}  // namespace coilassay

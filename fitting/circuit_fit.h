// A coil's circuit fitted to a sweep: one family, or the family the data ask for.
#pragma once

#include <Eigen/Core>
#include <complex>
#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "base/result.h"
#include "fitting/circuit.h"
#include "fitting/fit.h"

namespace coilassay {

/// In which form the errors of a sweep are alike.
enum class SweepErrors {
  ratio,        // of ln z: relative error of |z|, and phase in rad
  reflection,   // of S = (z - reference)/(z + reference): constant absolute error of the real and of the imaginary part
};

/// Data of a fit. Points whose z is NaN, 0 or beyond 1e60, or whose error is NaN, are not used; order of frequencies is free.
struct CircuitData {
  std::vector<double> frequency_hz;        // > 0
  std::vector<std::complex<double>> z;     // ohm
  SweepErrors errors = SweepErrors::ratio;
  double reference_ohm = 50;               // of S
  /// Standard deviation of the real and of the imaginary part (of ln z or of S), one per point or one for all. Stated in ohm:
  /// divide by |z|; stated as accuracy a |z| + b: (a |z| + b)/|z|.
  std::vector<double> u = {1};
  /// ratio only: that of the phase where it differs from that of ln |z|; empty: as u. Infinity: no phase was measured, and
  /// that of z is not looked at.
  std::vector<double> u_phase{};
  std::vector<double> correlation{};       // ratio only: between the errors of ln |z| and phase; empty: none
  /// false: u says only how the errors of the points compare; their common scale is found from the residuals.
  bool scale_known = true;

  std::size_t size() const { return frequency_hz.size(); }
};

/// A parameter the data do not see: its 95 % interval reaches zero (k_rel: one), and only the other end can be stated.
struct CircuitLimit {
  CircuitParameter parameter = CircuitParameter::series_resistance;
  bool at_most = true;        // false: at least (k_rel)
  double value = 0;           // by profile likelihood: chi-square rises by the square of the 97.5 % quantile; infinity (k_rel: 0):
                              // the data set none
  Circuit circuit;            // all the other parameters fitted again with this one at its limit: for limits of what follows from it
};

struct CircuitFit {
  Circuit circuit;                            // the minimum
  std::vector<CircuitParameter> order;        // of everything below
  Fit fit;                                    // natural parameters and their covariance; at_bound marks those in `limits`
  Eigen::MatrixXd log_covariance;             // of the logarithms of the parameters
  std::vector<CircuitLimit> limits;
  double chi_square = 0;                      // of the residuals by u, not rescaled
  double dof = 0;                             // real residuals less parameters
  double scale = 1;                           // residuals are this many times u: 1 when the scale is known, else sqrt(chi_square/dof)
  std::vector<std::complex<double>> residual; // per point in units of u * scale (real: ln |z| or Re S; imaginary: phase or Im S),
                                              // whitened where correlated; NaN where a point is not used
  std::vector<bool> used;                     // per point
  bool phase_used = true;

  /// Converged with a finite covariance. Parameters in `limits` have no value then, the others have.
  bool usable() const;
  bool seen(CircuitParameter parameter) const;   // in the family, and not in `limits`
  /// The limit of a parameter the data do not see, else nullptr.
  const CircuitLimit* limit_of(CircuitParameter parameter) const;
  double value(CircuitParameter parameter) const;
  double standard_uncertainty(CircuitParameter parameter) const;
  /// Variance of what has these derivatives to the natural parameters: slopes^T covariance slopes.
  double variance(std::span<const double> slopes) const;
  /// Covariance of the real and the imaginary part of Z at a frequency, by the covariance of the parameters.
  Eigen::Matrix2d impedance_covariance(double frequency_hz) const;
  /// 97.5 % quantile of the law of (value - truth)/u: normal when the scale is known, Student's t otherwise.
  double coverage_factor() const;
};

struct CircuitFitOptions {
  double reference_hz = 0;          // of R_skin and R_rel; 0: geometric mean of the lowest and the highest frequency
  std::optional<Circuit> start{};   // begin here and nowhere else
  bool limits = true;               // false: no profile likelihoods; `limits` stays empty
  bool quick = false;               // stop at a hundredth of a standard uncertainty: enough to compare circuits
};

/// Fits one family by least squares of (ln z_model - ln z)/u, or of (S_model - S)/u, over the logarithms of the parameters with
/// analytic derivatives. Starts are found in the data. A parameter that the data do not see at the minimum (its logarithm has
/// no slope there) is tried again at the value that would be just visible.
///
/// @return too_few_samples: fewer than 5 points used, or not more real residuals than parameters; bad_number: a frequency
///         that is not positive and finite; no_signal: the imaginary part is never positive where anything else is, no
///         inductance can be seen; not_converged.
/// @see docs/formulas.md#sweep
Result<CircuitFit> fit_circuit(const CircuitData& data, const CircuitFamily& family, const CircuitFitOptions& options = {});

/// A family that was tried, and what it costs: `criterion` is the Bayesian information criterion (Schwarz 1978), chi-square
/// + p ln n for known errors, n ln(chi-square) + p ln n for errors of unknown scale; n real residuals, p parameters.
struct CircuitCandidate {
  CircuitFamily family;
  double criterion = 0;
  double chi_square = 0;
  double dof = 0;
};

struct CircuitChoice {
  CircuitFit best;
  std::vector<CircuitCandidate> candidates;       // in order of the criterion, the chosen one first
  std::optional<CircuitCandidate> runner_up;      // the second best of them
  double lead = 0;                                // its criterion less that of the best; 10 and more is decisive
  std::vector<std::size_t> left_out;              // points no candidate explains, by index; not used in `best`
};

struct CircuitChoiceOptions {
  double reference_hz = 0;
  std::vector<CircuitFamily> families{};  // empty: R L C with any of no AC law, skin, relaxation, with and without parallel loss;
                                          // where the residuals of the best of them hang together, skin and relaxation together,
                                          // and where they still do, each with a second resonance
  bool leave_out = true;                  // the robust second pass
};

/// Fits the families and keeps the one with the least criterion. Points beyond what chance explains (a share of 1 in 1000
/// sweeps) are left out and the families compared again.
///
/// @return as fit_circuit, when no family can be fitted.
Result<CircuitChoice> choose_circuit(const CircuitData& data, const CircuitChoiceOptions& options = {});

}  // namespace coilassay

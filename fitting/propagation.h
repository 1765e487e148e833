// From the errors of inputs to the interval of a result: first order (JCGM 100) and by trials (JCGM 101).
#pragma once

#include <Eigen/Core>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <span>
#include <vector>

namespace coilassay {

/// Law of one independent error, with mean 0.
struct ErrorLaw {
  enum class Kind { normal, rectangular, student_t, triangular } kind = Kind::normal;
  double standard_uncertainty = 0;
  double dof = 0;  // student_t: scale is standard_uncertainty, which then is s/sqrt(n) as in JCGM 101, 6.4.9
};

/// Half-width factor of a sum of independent symmetric errors: P(|sum| <= k u) = confidence, u the root sum of squares of
/// the standard uncertainties (for student_t the scale, as in JCGM 100). Rectangular terms are convolved, student_t terms
/// keep their tails: k is 1.65 when one rectangular term rules, 1.96 for a normal sum, the t quantile when a term of few
/// degrees of freedom rules. Exact for a single law, to 1e-3 of k for sums.
///
/// @param confidence  between 0 and 1, not included
/// @return 0 when nothing is uncertain; NaN when a standard uncertainty is not known, negative or infinite, or degrees of
///         freedom are not positive
double coverage_factor(std::span<const ErrorLaw> terms, double confidence = 0.95);

/// Effective degrees of freedom (Welch-Satterthwaite, JCGM 100, G.4.1); infinity when no term has any.
double effective_dof(std::span<const ErrorLaw> terms);

/// Trials: draws every input from its law (joint normal for a correlated group) and evaluates f for each.
struct TrialInput {
  double value = 0;
  ErrorLaw law;
};
struct CorrelatedGroup {           // jointly normal inputs that follow the independent ones, in order
  Eigen::VectorXd mean;
  Eigen::MatrixXd covariance;      // may be semi-definite
};
struct TrialResult {
  double mean = 0, standard_uncertainty = 0;
  double low = 0, high = 0;                  // probabilistically symmetric interval (JCGM 101, 7.7.2)
  double shortest_low = 0, shortest_high = 0;  // JCGM 101, 5.3.4
};
/// f(inputs, outputs): inputs are the independent ones, then the group. Same seed, same result, whatever `threads`; f is
/// called from several threads at once and must write to its outputs only.
/// Trials in which an output is not finite (or was not written) are counted in `failed` and left out. With fewer than two
/// trials left every figure is NaN. Needs output_count * trials doubles of memory.
struct TrialReport {
  std::vector<TrialResult> outputs;
  std::uint64_t trials = 0, failed = 0;
};
TrialReport propagate_by_trials(std::span<const TrialInput> independent, const CorrelatedGroup& group,
                                std::size_t output_count,
                                const std::function<void(std::span<const double>, std::span<double>)>& f,
                                std::uint64_t trials, std::uint64_t seed, unsigned threads, double confidence = 0.95);

}  // namespace coilassay

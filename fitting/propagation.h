// From the errors of inputs to the interval of a result: first order (JCGM 100) and by trials (JCGM 101).
#pragma once

#include <cstdint>
#include <functional>
#include <span>
#include <vector>

#include <Eigen/Core>

namespace coilassay {

/// Law of one independent error, with mean 0.
struct ErrorLaw {
  enum class Kind { normal, rectangular, student_t, triangular } kind = Kind::normal;
  double standard_uncertainty = 0;
  double dof = 0;  // student_t: scale is standard_uncertainty, which then is s/sqrt(n) as in JCGM 101, 6.4.9
};

/// Half-width factor of a sum of independent symmetric errors: P(|sum| <= k u) = confidence, u the root sum of squares of
/// the standard uncertainties. Rectangular terms are convolved, student_t terms keep their tails: k is 1.65 when one
/// rectangular term rules, 1.96 for a normal sum, the t quantile when a term of few degrees of freedom rules.
double coverage_factor(std::span<const ErrorLaw> terms, double confidence = 0.95);

/// Effective degrees of freedom (Welch-Satterthwaite); infinity when no term has any.
double effective_dof(std::span<const ErrorLaw> terms);

/// Trials: draws every input from its law (joint normal for a correlated group) and evaluates f for each.
struct TrialInput {
  double value = 0;
  ErrorLaw law;
};
struct CorrelatedGroup {           // jointly normal inputs that follow the independent ones, in order
  Eigen::VectorXd mean;
  Eigen::MatrixXd covariance;
};
struct TrialResult {
  double mean = 0, standard_uncertainty = 0;
  double low = 0, high = 0;                  // probabilistically symmetric interval
  double shortest_low = 0, shortest_high = 0;
};
/// f(inputs, outputs): inputs are the independent ones, then the group. Same seed, same result, whatever `threads`.
/// Trials in which f gives a NaN are counted in `failed` and left out.
struct TrialReport {
  std::vector<TrialResult> outputs;
  std::uint64_t trials = 0, failed = 0;
};
TrialReport propagate_by_trials(std::span<const TrialInput> independent, const CorrelatedGroup& group,
                                std::size_t output_count,
                                const std::function<void(std::span<const double>, std::span<double>)>& f,
                                std::uint64_t trials, std::uint64_t seed, unsigned threads, double confidence = 0.95);

}  // namespace coilassay

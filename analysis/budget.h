// From named errors to estimates with intervals: the doctrine of docs/uncertainty.md in one place.
#pragma once

#include <Eigen/Core>
#include <functional>
#include <string>
#include <vector>

#include "analysis/measurement.h"
#include "base/result.h"
#include "fitting/propagation.h"

namespace coilassay {

/// How uncertainty is carried, as chosen on the command line.
struct PropagationOptions {
  bool by_trials = false;
  std::uint64_t trials = 200000;
  std::uint64_t seed = 1;
  unsigned threads = 2;
  bool exact_bench = false;   // no default tolerances: only what is stated and what the data show
};

/// One independent input error of a measurement.
struct InputError {
  std::string source;      // its name in the budget
  double value = 0;        // best value of the input
  ErrorLaw law;
  char kind = 'B';
  bool common = false;
  std::string basis;
};

/// Inputs from a fit: jointly normal, covariance from the fit (a group of parameters with one name in the budget).
struct FittedInputs {
  std::string source = "fit";
  Eigen::VectorXd values;
  Eigen::MatrixXd covariance;
  double dof = 0;          // 0: many
};

struct OutputSpec {
  std::string symbol;
  std::optional<double> at_hz;
};

/// Measurement function: inputs are the independent ones in order, then the fitted ones; one output per spec.
using MeasurementFunction = std::function<void(std::span<const double> inputs, std::span<double> outputs)>;

/// Evaluates the function at the best values, carries every error through it (first order by central differences of
/// u/10; or by trials), and adds estimates, budget lines and correlations to `result`. Extra terms act on one output only.
struct ExtraTerm {
  std::string symbol, source;
  double u = 0;            // in the unit of the output
  ErrorLaw::Kind law = ErrorLaw::Kind::normal;
  char kind = 'A';
  bool common = false;
  std::string basis;
};
void add_estimates(Measurement& result, const std::vector<InputError>& inputs, const FittedInputs& fitted,
                   const std::vector<OutputSpec>& outputs, const MeasurementFunction& f,
                   const std::vector<ExtraTerm>& extra, const PropagationOptions& options);

/// An input error from what was stated; when nothing was stated, the default (rectangular half-width, SI) with its
/// reason, unless `exact_bench`.
InputError input_error(std::string source, const StatedValue& stated, double default_half_width, std::string default_reason,
                       bool common, const PropagationOptions& options);

}  // namespace coilassay

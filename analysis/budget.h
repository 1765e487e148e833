// From named errors to estimates with intervals: the doctrine of docs/uncertainty.md in one place.
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <functional>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "analysis/measurement.h"
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
  bool common = true;      // the same error for every unit measured on this bench
  std::string basis;       // "stated", "default: ..."
};

/// Inputs from a fit: jointly normal, one line of the budget.
struct FittedInputs {
  std::string source = "fit";
  Eigen::VectorXd values;
  Eigen::MatrixXd covariance;
  double dof = 0;          // 0: many
  /// Values on the edge of the 95 % region where that is no ellipse (fitting/decay_contour.h); empty: the covariance serves.
  std::vector<Eigen::VectorXd> contour;
};

/// How an output's interval is formed. `reciprocal`: the function gives 1/y, whose errors are the nearly linear ones (a
/// quality factor), and the interval of y is the image of the interval of 1/y: not symmetric, open when 1/y reaches 0.
struct OutputSpec {
  std::string symbol;
  bool reciprocal = false;
  std::optional<double> at_hz = std::nullopt;
};

/// An error that acts on one output only, in the unit of that output.
struct ExtraTerm {
  std::string symbol, source;
  ErrorLaw law;
  char kind = 'A';
  bool common = false;
  std::string basis;
};

/// Measurement function: inputs are the independent ones in order, then the fitted ones; one output per spec. A NaN output
/// means that the inputs admit no such value.
using MeasurementFunction = std::function<void(std::span<const double> inputs, std::span<double> outputs)>;

/// Evaluates the function at the best values, carries every error through it and adds estimates, budget and correlations.
///
/// First order (JCGM 100): sensitivities by central differences over one standard uncertainty; the interval from the
/// convolved laws (fitting/propagation.h). The same differences show how far the function bends: more than a tenth of u,
/// and finding propagation_disagrees says so. By trials (JCGM 101): u and the interval from the trials, compared with first
/// order by the rule of JCGM 101, 8.1, at two digits.
/// With a contour, the part of the fit in each interval is the range of the output over it, each side for itself, joined
/// with the other errors by root sum of squares; u is then that of the wider side over 1.96.
/// An output that is NaN at the best values is left out. A reciprocal output whose interval is open becomes a bound
/// (`at_least`) when its standard uncertainty exceeds the value of 1/y, and otherwise keeps its value with an upper end at
/// infinity replaced by the bound.
void add_estimates(Measurement& result, const std::vector<InputError>& inputs, const FittedInputs& fitted,
                   const std::vector<OutputSpec>& outputs, const MeasurementFunction& f,
                   const std::vector<ExtraTerm>& extra, const PropagationOptions& options);

/// What enters when a tolerance was left unsaid: the half-width of a rectangular law and why.
struct DefaultTolerance {
  double half_width = 0;   // SI
  std::string reason;
};

/// An input error from what was stated; with no tolerance stated, the default, unless `exact_bench`.
InputError input_error(std::string source, const StatedValue& stated, const DefaultTolerance& otherwise,
                       const PropagationOptions& options);

}  // namespace coilassay

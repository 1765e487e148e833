// The joint solution of all readings of a pair of windings.
#pragma once

#include <array>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "analysis/coupling_readings.h"
#include "fitting/bounded_interval.h"
#include "fitting/joint_fit.h"

namespace coilassay {

// Places of the unknowns; behind them stand the shared errors.
enum CouplingUnknown : std::size_t {
  kLnL1,
  kLnL2,
  kCoupling,   // k, or k^2 where nothing shows M itself
  kR1,
  kR2,
  kSkin1,
  kSkin2,
  kC1,
  kC2,
  kLink,
  kLinkR,
  kFirstShared
};

/// What a person stated about the pair, as readings of the unknowns themselves.
struct CouplingPrior {
  std::size_t unknown;
  InputError error;
};

/// One row of the residuals: who made the error, and by which law.
struct CouplingRow {
  std::string source;
  ErrorLaw::Kind law = ErrorLaw::Kind::normal;
  char kind = 'B';
  bool common = false;
  std::string basis;
  std::size_t trace = static_cast<std::size_t>(-1);   // of the readings, or none
  bool scatter = false;
};

struct CouplingTraceCheck {
  double chi_square = 0;       // of its rows, in units of its own scatter
  std::size_t rows = 0;
  double misfit = 1;           // residuals over scatter, where they are larger than chance allows
};

struct CouplingSolution {
  CouplingReadings readings;       // u of scattering traces as the fit shows them
  std::vector<CouplingTrace> as_scattered;   // the same traces with u by third differences, which no model has touched
  std::vector<CouplingPrior> priors;
  bool squared = false;            // kCoupling is k^2
  bool side1 = false, side2 = false;   // whether any reading touches that winding's own terminals
  bool link_referred = true;       // the link and the resistance of the shorted side could be taken into account
  double skin_hz = 1;
  std::vector<double> scale;
  std::vector<bool> fixed;
  JointFit fit;
  std::vector<CouplingRow> rows;
  std::vector<CouplingTraceCheck> checks;   // one per trace
  double degrees = 0;              // of freedom
  double widened = 1;              // by disagreement of the inputs
  double p_value = 1;              // of chi-square, were the inputs consistent
  bool k_determined = false;

  WindingPair pair_at(std::span<const double> unknowns) const;
  JointProblem problem() const;    // of these readings; keeps a copy of what it needs
};

/// Solves; never fails: what is not determined is told by fitting/joint_fit.h.
CouplingSolution solve_coupling(CouplingReadings readings, std::vector<CouplingPrior> priors);

/// Interval of kCoupling within what is possible. `low` is -1 where the sign is known, else 0.
BoundedInterval coupling_interval(const CouplingSolution& solution, double low, double factor_two_sided,
                                  double factor_one_sided);

/// Chi-square when one trace is left out; NaN when nothing is left to compare.
double chi_square_without(const CouplingSolution& solution, std::size_t trace);

/// Solved with the u that no model has touched: what a model cannot explain stands out in its chi-square.
CouplingSolution as_scattered(const CouplingSolution& solution);

/// The same readings, but the short's inductance as whatever suits them best, whatever was stated.
CouplingSolution with_free_link(const CouplingSolution& solution);

/// Solved again with other readings of the same kinds (two inputs exchanged, say).
CouplingSolution with_traces(const CouplingSolution& solution, std::vector<CouplingTrace> traces);

}  // namespace coilassay
